// The frequency cursor: a slider, or a pointer over the response; what it shows was worked out before.
(function (data) {
  const box = document.querySelector(".cursor");
  if (!box) return;
  const slider = box.querySelector("input");
  const cells = [...box.querySelectorAll("[data-at]")];
  const charts = [...document.querySelectorAll("svg[data-axes]")].map((svg) => {
    const [left, right, top, bottom] = svg.dataset.axes.split(" ").map(Number);
    const line = document.createElementNS(svg.namespaceURI, "line");
    line.setAttribute("class", "cursor-line");
    line.setAttribute("y1", top);
    line.setAttribute("y2", bottom);
    svg.append(line);
    return { svg, line, left, right };
  });
  const show = (k) => {
    slider.value = k;
    slider.setAttribute("aria-valuetext", data.texts[k][0]);
    for (const cell of cells) cell.textContent = data.texts[k][cell.dataset.at];
    for (const { line, left, right } of charts) {
      const x = left + data.places[k] * (right - left);
      line.setAttribute("x1", x);
      line.setAttribute("x2", x);
    }
  };
  const nearest = (place) => {
    let best = 0;
    data.places.forEach((there, k) => {
      if (Math.abs(there - place) < Math.abs(data.places[best] - place)) best = k;
    });
    return best;
  };
  for (const { svg, left, right } of charts) {
    const follow = (event) => {
      const frame = svg.getBoundingClientRect();
      const x = ((event.clientX - frame.left) / frame.width) * svg.viewBox.baseVal.width;
      if (x >= left - 4 && x <= right + 4) show(nearest((x - left) / (right - left)));
    };
    svg.addEventListener("pointermove", follow);
    svg.addEventListener("pointerdown", follow);
  }
  slider.addEventListener("input", () => show(Number(slider.value)));
  box.hidden = false;
  show(Number(slider.value));
})(
