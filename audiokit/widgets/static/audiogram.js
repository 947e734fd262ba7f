// Puts a finished drawing in place; one Tab stop, arrow keys from point to point, and a line that says the point.
const HINT = "Tab to the chart, then arrow keys go from point to point.";

function wire(el) {
  const readout = el.querySelector(".ak-readout");
  const points = [...el.querySelectorAll(".ak-point")].sort((a, b) => Number(a.dataset.hz) - Number(b.dataset.hz));
  const say = (point) => (readout.textContent = point ? point.getAttribute("aria-label") : HINT);
  points.forEach((point, at) => {
    point.setAttribute("tabindex", at === 0 ? "0" : "-1");
    point.addEventListener("focus", () => say(point));
    point.addEventListener("mouseenter", () => say(point));
    point.addEventListener("mouseleave", () => say(el.querySelector(".ak-point:focus")));
    point.addEventListener("keydown", (event) => {
      const last = points.length - 1;
      const to = { ArrowRight: at + 1, ArrowDown: at + 1, ArrowLeft: at - 1, ArrowUp: at - 1, Home: 0, End: last }[event.key];
      if (to === undefined) return;
      event.preventDefault();
      event.stopPropagation();
      const next = points[Math.min(Math.max(to, 0), last)];
      point.setAttribute("tabindex", "-1");
      next.setAttribute("tabindex", "0");
      next.focus();
    });
  });
  say(null);
  readout.hidden = !points.length;
}

function render({ model, el }) {
  el.classList.add("ak-root", "ak-audiogram-view");
  el.dataset.lmSuppressShortcuts = "true"; // Enter and arrow keys are ours here, not the notebook's.
  const draw = () => {
    el.innerHTML = model.get("svg");
    const readout = document.createElement("p");
    readout.className = "ak-readout";
    readout.setAttribute("aria-hidden", "true");
    el.append(readout);
    wire(el);
  };
  model.on("change:svg", draw);
  draw();
  return () => model.off("change:svg", draw);
}

export default { render };
