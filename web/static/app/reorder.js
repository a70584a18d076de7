/**
 * Drag a row by its grip to another place in its list; arrow keys on the grip do the same.
 *
 * @param {HTMLElement} grip
 * @param {object} options
 * @param {HTMLElement} options.row
 * @param {() => HTMLElement[]} options.rows all rows that can change places, in order
 * @param {(from: number, to: number) => void} options.move
 */
export function draggableRow(grip, { row, rows, move }) {
  let drag = null;

  grip.addEventListener("pointerdown", (event) => {
    if (event.button !== 0) return;
    event.preventDefault();
    grip.focus();
    grip.setPointerCapture(event.pointerId);
    const all = rows();
    const from = all.indexOf(row);
    drag = { from, to: from, startY: event.clientY, middles: all.map((one) => middle(one)), all };
    row.classList.add("is-dragged");
  });
  grip.addEventListener("pointermove", (event) => {
    if (!drag) return;
    const shift = event.clientY - drag.startY;
    row.style.transform = `translateY(${shift}px)`;
    const at = drag.middles[drag.from] + shift;
    drag.to = drag.middles.filter((y, index) => index !== drag.from && y < at).length;
    drag.all.forEach((one, index) => {
      one.classList.toggle("drops-before", drag.to < drag.from && index === drag.to);
      one.classList.toggle("drops-after", drag.to > drag.from && index === drag.to);
    });
  });
  grip.addEventListener("pointerup", () => end(true));
  grip.addEventListener("pointercancel", () => end(false));
  grip.addEventListener("keydown", (event) => {
    if (event.key === "Escape" && drag) return end(false);
    const step = { ArrowUp: -1, ArrowDown: 1 }[event.key];
    if (!step) return;
    event.preventDefault();
    event.stopPropagation();
    const all = rows();
    const from = all.indexOf(row);
    if (from + step >= 0 && from + step < all.length) move(from, from + step);
  });

  function end(keep) {
    if (!drag) return;
    const { from, to, all } = drag;
    drag = null;
    row.style.transform = "";
    row.classList.remove("is-dragged");
    all.forEach((one) => one.classList.remove("drops-before", "drops-after"));
    if (keep && to !== from) move(from, to);
  }
}

function middle(row) {
  const box = row.getBoundingClientRect();
  return box.top + box.height / 2;
}
