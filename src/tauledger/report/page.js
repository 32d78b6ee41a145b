"use strict";
// Everything on the page reads without this: it only shows which row, bar and symbol speak of the same part.
(function () {
  const mates = new Map();
  for (const element of document.querySelectorAll("[data-part]")) {
    const part = element.dataset.part;
    if (!mates.has(part)) mates.set(part, []);
    mates.get(part).push(element);
  }
  const mark = (event, on) => {
    const found = event.target instanceof Element ? event.target.closest("[data-part]") : null;
    if (!found) return;
    for (const mate of mates.get(found.dataset.part)) mate.classList.toggle("linked", on);
  };
  document.addEventListener("mouseover", (event) => mark(event, true));
  document.addEventListener("mouseout", (event) => mark(event, false));
})();
