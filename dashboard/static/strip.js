// Pointing at a cell of a strip, or walking to it by keyboard, names the save, the figure and the edit.
"use strict";
(() => {
  const readout = document.createElement("div");
  readout.className = "readout";
  readout.hidden = true;
  readout.setAttribute("aria-hidden", "true"); // the link's own label is what assistive technology reads
  document.body.append(readout);

  const cellOf = (target) => (target instanceof Element ? target.closest(".strip .cell") : null);

  function label(cell) {
    const title = cell.querySelector("title");
    if (title) {
      cell.setAttribute("aria-label", title.textContent);
      title.remove(); // so that the browser's own tip does not cover the readout
    }
    return cell.getAttribute("aria-label") || "";
  }

  function show(cell) {
    readout.textContent = label(cell);
    readout.hidden = false;
    const box = cell.getBoundingClientRect();
    const size = readout.getBoundingClientRect();
    const room = document.documentElement.clientWidth - size.width - 8;
    const left = Math.max(8, Math.min(box.left + box.width / 2 - size.width / 2, room));
    const below = box.bottom + 6 + size.height < window.innerHeight;
    const top = below ? box.bottom + 6 : box.top - size.height - 6;
    readout.style.left = `${left + window.scrollX}px`;
    readout.style.top = `${top + window.scrollY}px`;
  }

  const hide = () => { readout.hidden = true; };

  document.addEventListener("pointerover", (event) => {
    const cell = cellOf(event.target);
    if (cell) show(cell);
    else if (!cellOf(document.activeElement)) hide();
  });
  document.addEventListener("focusin", (event) => {
    const cell = cellOf(event.target);
    if (!cell) return hide();
    for (const other of cell.parentNode.querySelectorAll('.cell[tabindex="0"]')) other.setAttribute("tabindex", "-1");
    cell.setAttribute("tabindex", "0");
    show(cell);
  });

  const steps = { ArrowLeft: -1, ArrowRight: 1, Home: -Infinity, End: Infinity };
  document.addEventListener("keydown", (event) => {
    const cell = cellOf(event.target);
    if (event.key === "Escape") return hide();
    if (!cell || event.altKey || event.ctrlKey || event.metaKey) return;
    if (event.key in steps) {
      const cells = [...cell.parentNode.querySelectorAll(".cell")];
      const place = Math.max(0, Math.min(cells.length - 1, cells.indexOf(cell) + steps[event.key]));
      cells[place].focus();
      event.preventDefault();
    } else if (event.key === "ArrowUp" || event.key === "ArrowDown") {
      const place = [...cell.parentNode.querySelectorAll(".cell")].indexOf(cell);
      const strips = [...document.querySelectorAll(".strip")];
      const next = strips[strips.indexOf(cell.parentNode) + (event.key === "ArrowUp" ? -1 : 1)];
      const there = next && next.querySelectorAll(".cell")[place];
      if (there) {
        there.focus();
        event.preventDefault();
      }
    }
  });
  document.addEventListener("page:changed", hide);
})();
