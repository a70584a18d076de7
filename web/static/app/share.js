import { el, textButton } from "./element.js";
import { textInput } from "./field.js";
import { encodeFragment } from "./fragment.js";
import { copyText } from "./keep_file.js";
import { ask } from "./request.js";
import { forgetLink, rememberLink, sharedLinks } from "./shared_links.js";
import { sheet } from "./sheet.js";

/** Longer addresses are cut by some mail programs and chats. */
const LONG_LINK = 2000;

/**
 * Share the design as it stands: a short link kept by this server, or a link that carries the design in itself.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @returns {() => void} opens the dialog
 */
export function share(root, store) {
  const window_ = sheet(root, { title: "share link", class: "share-sheet" });
  const made = el("div", { class: "share-made" });
  const fault = el("p", { class: "fault", role: "alert" });
  const carried = el("div", { class: "share-made" });
  const earlier = el("section", { class: "share-earlier" });
  const make = el("button", { type: "button", class: "strong", text: "make a link", on: { click: makeLink } });
  window_.body.append(
    el("section", {}, el("p", { text: "Whoever opens the link sees exactly this design, as it is now, and goes on with a copy: nothing they do changes yours, and nothing you do later changes what the link shows." }),
      make, fault, made),
    el("section", {}, el("h3", { text: "without this server" }),
      el("p", { class: "hint", text: "This link carries the whole design in itself, for colleagues who run their own Loopwright. It cannot be withdrawn." }), carried),
    earlier,
  );
  let design = null;

  async function makeLink() {
    make.disabled = true;
    fault.textContent = "";
    const answer = await ask("POST", "/api/designs", design);
    make.disabled = false;
    if (!answer.ok) {
      fault.textContent = answer.errors.map(({ where, what }) => (where ? `${where}: ${what}` : what)).join("\n");
      return;
    }
    const { token, link, withdraw_key, design_sha256 } = answer.body;
    const kept = rememberLink({ token, link, withdraw_key, design_sha256, title: design.title ?? "", made_at: new Date().toISOString() });
    make.hidden = true;
    made.replaceChildren(linkLine(link, "the link"), kept ? withdrawLine(token, withdraw_key, made) : keyLine(withdraw_key));
    made.querySelector("button").focus();
    store.say("the link is ready");
    drawEarlier(token);
  }

  function drawEarlier(current) {
    const links = sharedLinks().filter((one) => one.token !== current);
    earlier.hidden = links.length === 0;
    earlier.replaceChildren(el("h3", { text: "made in this browser before" }), el("ul", { class: "links" }, ...links.map((one) => {
      const line = el("li", {}, el("span", { class: "link-title", text: one.title || "design without title" }),
        el("time", { class: "hint", datetime: one.made_at, text: new Date(one.made_at).toLocaleString() }));
      const copy = textButton("copy", () => copyText(one.link, copy), { "aria-label": `copy the link to ${one.title}` });
      line.append(copy, withdrawButton(one.token, one.withdraw_key, line, one.title));
      return line;
    })));
  }

  return async () => {
    if (!store.design) return;
    design = store.design;
    fault.textContent = "";
    made.replaceChildren();
    make.hidden = false;
    drawEarlier(null);
    window_.open();
    make.focus();
    const link = `${location.origin}/#${await encodeFragment(design)}`;
    carried.replaceChildren(linkLine(link, "the link that carries the design"), ...(link.length > LONG_LINK
      ? [el("p", { class: "hint", text: `It has ${link.length} characters; some mail programs cut such addresses.` })] : []));
  };
}

function linkLine(link, name) {
  const shown = textInput(link, { class: "field mono", readonly: true, "aria-label": name, on: { focus: (event) => event.target.select() } });
  const copy = el("button", { type: "button", class: "outlined", text: "copy", "aria-label": `copy ${name}`, on: { click: () => copyText(link, copy, shown) } });
  return el("div", { class: "link-line" }, shown, copy);
}

function withdrawLine(token, key, place) {
  return el("p", { class: "hint" }, "Shared by mistake? The key that withdraws it is kept in this browser: ", withdrawButton(token, key, place, "the design just shared"));
}

function keyLine(key) {
  return el("p", { class: "hint" }, "This browser keeps nothing, so note the key that withdraws the link: ", el("code", { text: key }));
}

/** Withdrawing asks once more, since the link is then gone for everyone. */
function withdrawButton(token, key, place, title) {
  const button = textButton("withdraw", async () => {
    if (button.dataset.sure !== "true") {
      button.dataset.sure = "true";
      button.textContent = "withdraw for everyone?";
      return;
    }
    const answer = await ask("DELETE", `/api/designs/${encodeURIComponent(token)}`, undefined, { "X-Withdraw-Key": key });
    if (answer.ok || answer.status === 404) {
      forgetLink(token);
      place.replaceChildren(el("p", { class: "hint", role: "status", text: "Withdrawn: the link shows nothing any more. Copies that were opened before stay with those who opened them." }));
    } else button.textContent = answer.errors[0].what;
  }, { "aria-label": null, title: `withdraw ${title}` });
  button.addEventListener("blur", () => {
    if (button.dataset.sure !== "true") return;
    delete button.dataset.sure;
    button.textContent = "withdraw";
  });
  return button;
}
