// Keeps an open page up to date: when the server says that something changed, the main part is fetched and put in
// place of the old one, with focus, scroll position and opened details kept.
"use strict";
(() => {
  const source = document.body.dataset.events;
  if (!source || !window.EventSource) return;
  const news = document.getElementById("live");
  const POLL = 15000;
  let fetching = false;
  let again = false;

  const main = () => document.getElementById("main");

  // Where the focus is, in words that still mean something after the change.
  function remember() {
    const active = document.activeElement;
    if (!active || !main().contains(active)) return null;
    const row = active.closest("[data-key]");
    const cell = active.closest(".cell");
    const place = cell ? [...cell.parentNode.querySelectorAll(".cell")].reverse().indexOf(cell) : -1;
    return { id: active.id, href: active.getAttribute("href"), key: row && row.dataset.key, place };
  }

  function restore(mark) {
    if (!mark) return;
    let target = mark.id && document.getElementById(mark.id);
    const row = mark.key && [...document.querySelectorAll("[data-key]")].find((one) => one.dataset.key === mark.key);
    if (!target && row && mark.place >= 0) target = [...row.querySelectorAll(".cell")].reverse()[mark.place];
    if (!target && row) target = row.querySelector("a");
    if (!target && mark.href) target = [...main().querySelectorAll("a")].find((one) => one.getAttribute("href") === mark.href);
    (target || main()).focus({ preventScroll: true });
  }

  async function refresh() {
    if (fetching) {
      again = true;
      return;
    }
    fetching = true;
    try {
      const answer = await fetch(location.href, { headers: { "X-Page-Part": "main" }, cache: "no-store" });
      const text = await answer.text();
      const part = new DOMParser().parseFromString(text, "text/html").getElementById("main");
      if (part && part.dataset.seen !== main().dataset.seen) replace(part);
    } catch {
      // The server is away; the stream reconnects by itself and says so again.
    } finally {
      fetching = false;
      if (again) {
        again = false;
        refresh();
      }
    }
  }

  function replace(part) {
    const mark = remember();
    const scroll = [window.scrollX, window.scrollY];
    const opened = new Set([...main().querySelectorAll("details[open]")].map((one) => one.dataset.key));
    const fresh = document.importNode(part, true);
    fresh.classList.add("fresh");
    main().replaceWith(fresh);
    for (const one of fresh.querySelectorAll("details")) one.open = one.open || opened.has(one.dataset.key);
    document.title = fresh.dataset.title || document.title;
    window.scrollTo(...scroll);
    restore(mark);
    document.dispatchEvent(new CustomEvent("page:changed"));
    const standing = fresh.querySelector(".standing");
    news.textContent = `Updated. ${standing ? standing.textContent.trim() : ""}`;
  }

  let stream = null;
  let polling = 0;
  function open() {
    const mark = source.includes("?") ? "&" : "?";
    stream = new EventSource(`${source}${mark}seen=${encodeURIComponent(main().dataset.seen)}`);
    stream.addEventListener("change", refresh);
    stream.addEventListener("open", () => {
      clearInterval(polling);
      polling = 0;
    });
    stream.addEventListener("error", () => {
      // Closed for good means that all places are taken: ask now and then instead.
      if (stream.readyState === EventSource.CLOSED && !polling) polling = setInterval(refresh, POLL);
    });
  }
  open();
  // A page kept for going back to must not hold a place on the server.
  window.addEventListener("pagehide", () => stream.close());
  window.addEventListener("pageshow", (event) => { if (event.persisted) { open(); refresh(); } });
})();
