// A heading that the keyboard's focus can be sent to when something new stands below it.
function render({ model, el }) {
  el.classList.add("ak-root");
  const heading = document.createElement("h3");
  heading.className = "ak-heading";
  heading.tabIndex = -1;
  el.replaceChildren(heading);
  const draw = () => {
    const name = document.createElement("bdi");
    name.textContent = model.get("name");
    heading.replaceChildren(model.get("lead"), " ", name);
  };
  const told = () => {
    heading.scrollIntoView({ block: "start" });
    heading.focus({ preventScroll: true });
  };
  model.on("change:lead change:name", draw);
  model.on("msg:custom", told);
  draw();
  return () => {
    model.off("change:lead change:name", draw);
    model.off("msg:custom", told);
  };
}

export default { render };
