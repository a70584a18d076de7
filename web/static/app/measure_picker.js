import { el, freshId } from "./element.js";

/**
 * Choose a measure: all of them in their groups, narrowed as one types.
 *
 * @param {(measure: string) => void} chosen
 * @returns {{node: HTMLElement, input: HTMLInputElement, set: (measures: any[], measure: string|null) => void, value: () => string|null}}
 */
export function measurePicker(chosen) {
  const listId = freshId("measures");
  const input = el("input", {
    type: "text", class: "field", role: "combobox", "aria-expanded": "false", "aria-controls": listId, "aria-autocomplete": "list",
    autocomplete: "off", spellcheck: "false", placeholder: "type to search, as “margin” or “error”",
  });
  const list = el("div", { class: "measure-list", id: listId, role: "listbox", "aria-label": "measures", hidden: true });
  const node = el("div", { class: "measure-picker" }, input, list);
  let measures = [];
  let value = null;
  let active = -1;

  const labelOf = (name) => measures.find((one) => one.measure === name)?.label ?? "";
  const options = () => [...list.querySelectorAll("[role=option]")];

  function show(search) {
    const words = search.toLowerCase().split(/\s+/).filter(Boolean);
    const fits = measures.filter((one) => {
      const text = `${one.label} ${one.what} ${one.group ?? ""} ${one.measure}`.toLowerCase();
      return words.every((word) => text.includes(word));
    });
    list.replaceChildren(...grouped(fits).map(group));
    if (fits.length === 0) list.replaceChildren(el("p", { class: "hint", text: "No measure has these words; try fewer letters" }));
    list.hidden = false;
    input.setAttribute("aria-expanded", "true");
    setActive(options().findIndex((option) => option.dataset.measure === value));
  }

  function group([name, members]) {
    const heading = el("div", { class: "measure-group", id: freshId("group"), text: name });
    return el("div", { role: "group", "aria-labelledby": heading.id }, heading, ...members.map((one) =>
      el("div", {
        role: "option", id: freshId("measure"), class: "measure-option", "aria-selected": String(one.measure === value),
        data: { measure: one.measure }, on: { pointerdown: (event) => event.preventDefault(), click: () => choose(one.measure) },
      }, el("span", { class: "measure-label", text: one.label + (one.unit && one.unit !== "1" ? `, ${one.unit}` : "") }),
      el("span", { class: "measure-what", text: one.what }))));
  }

  function hide() {
    list.hidden = true;
    input.setAttribute("aria-expanded", "false");
    input.removeAttribute("aria-activedescendant");
    input.value = labelOf(value);
  }

  function setActive(index) {
    const all = options();
    active = all.length === 0 ? -1 : Math.max(-1, Math.min(index, all.length - 1));
    all.forEach((option, i) => option.classList.toggle("is-active", i === active));
    if (active < 0) return input.removeAttribute("aria-activedescendant");
    input.setAttribute("aria-activedescendant", all[active].id);
    all[active].scrollIntoView({ block: "nearest" });
  }

  function choose(measure) {
    value = measure;
    hide();
    chosen(measure);
  }

  input.addEventListener("focus", () => input.select());
  input.addEventListener("click", () => show(""));
  input.addEventListener("input", () => {
    show(input.value);
    setActive(0);
  });
  input.addEventListener("blur", hide);
  input.addEventListener("keydown", (event) => {
    const open = !list.hidden;
    if (event.key === "ArrowDown" || event.key === "ArrowUp") {
      event.preventDefault();
      if (!open) show("");
      else setActive(active + (event.key === "ArrowDown" ? 1 : -1));
    } else if (event.key === "Enter" && open) {
      event.preventDefault();
      if (active >= 0) choose(options()[active].dataset.measure);
    } else if (event.key === "Escape" && open) {
      event.preventDefault();
      event.stopPropagation();
      hide();
    }
  });

  return {
    node,
    input,
    value: () => value,
    set(all, measure) {
      measures = all;
      value = measure;
      hide();
    },
  };
}

function grouped(measures) {
  const groups = new Map();
  for (const one of measures) {
    const name = one.group ?? (one.kind === "frequency" ? "at chosen frequencies" : "measures");
    groups.set(name, [...(groups.get(name) ?? []), one]);
  }
  return [...groups];
}
