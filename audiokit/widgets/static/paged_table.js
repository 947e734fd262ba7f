// A real table, one page of it: the kernel filters, sorts and pages; this draws and reports what was asked for.
function make(tag, attributes = {}, ...children) {
  const node = document.createElement(tag);
  for (const [name, value] of Object.entries(attributes)) {
    if (value !== null && value !== undefined && value !== false) node.setAttribute(name, value);
  }
  node.append(...children);
  return node;
}

function isolated(text) {
  return make("bdi", {}, text);
}

function headCell(column, model) {
  const mark = { ascending: " ▲", descending: " ▼", none: "" }[column.sort];
  const button = make("button", { type: "button", class: "ak-sort", "data-spot": `sort:${column.key}` }, column.label);
  if (mark) button.append(make("span", { "aria-hidden": "true" }, mark));
  button.addEventListener("click", () => model.send({ do: "sort", key: column.key }));
  return make("th", { scope: "col", class: `ak-${column.align}`, "aria-sort": column.sort }, button);
}

function bodyRow(row, view, model) {
  const cells = row.cells.map((text, at) => {
    const column = view.columns[at];
    const strong = column.emphasis.includes(text) ? " ak-strong" : "";
    const short = text.length <= 18 ? " ak-short" : ""; // as `look.py` has it
    const known = at === 0 ? { scope: "row" } : {};
    return make(at === 0 ? "th" : "td", { ...known, class: `ak-${column.align}${strong}${short}` }, isolated(text));
  });
  if (!view.pickable) return make("tr", {}, ...cells);
  const node = make(
    "tr",
    { tabindex: "0", class: "ak-pickable", "data-spot": `row:${row.id}`, "aria-current": row.picked ? "true" : null },
    ...cells,
  );
  const pick = () => model.send({ do: "pick", id: row.id, stamp: view.stamp });
  node.addEventListener("click", pick);
  node.addEventListener("keydown", (event) => {
    if (event.key === "Enter" || event.key === " ") {
      event.preventDefault();
      event.stopPropagation();
      pick();
    }
    const step = { ArrowDown: "nextElementSibling", ArrowUp: "previousElementSibling" }[event.key];
    if (step) {
      event.preventDefault();
      event.stopPropagation();
      node[step]?.focus();
    }
  });
  return node;
}

function pageButton(label, page, enabled, model) {
  const button = make("button", { type: "button", "data-spot": `page:${label}`, disabled: enabled ? null : "" }, label);
  button.addEventListener("click", () => model.send({ do: "page", page }));
  return button;
}

function pager(view, model) {
  const size = make("select", { "data-spot": "size" });
  for (const choice of view.sizes) {
    size.append(make("option", { value: choice, selected: choice === view.size ? "" : null }, String(choice)));
  }
  size.addEventListener("change", () => model.send({ do: "size", size: Number(size.value) }));
  return make(
    "div",
    { class: "ak-pager" },
    pageButton("First", 0, view.page > 0, model),
    pageButton("Previous", view.page - 1, view.page > 0, model),
    make("span", { role: "status", "aria-live": "polite" }, view.place),
    pageButton("Next", view.page + 1, view.page + 1 < view.pages, model),
    pageButton("Last", view.pages - 1, view.page + 1 < view.pages, model),
    make("label", {}, "rows a page ", size),
  );
}

function draw(model, el) {
  const view = model.get("view");
  const spot = el.contains(document.activeElement) ? document.activeElement.dataset.spot : null;
  const head = make("thead", {}, make("tr", {}, ...view.columns.map((column) => headCell(column, model))));
  const body = make("tbody", {}, ...view.rows.map((row) => bodyRow(row, view, model)));
  if (!view.rows.length) {
    body.append(make("tr", {}, make("td", { colspan: view.columns.length, class: "ak-empty" }, view.empty)));
  }
  const table = make("table", { class: "ak-table ak-paged" }, make("caption", {}, view.caption), head, body);
  el.replaceChildren(table, ...(view.paged ? [pager(view, model)] : []));
  if (spot) {
    const again = el.querySelector(`[data-spot="${CSS.escape(spot)}"]`);
    (again && !again.disabled ? again : el.querySelector("tbody tr[tabindex], .ak-sort"))?.focus();
  }
}

function render({ model, el }) {
  el.classList.add("ak-root", "ak-paged-table");
  el.dataset.lmSuppressShortcuts = "true"; // Enter and arrow keys are ours here, not the notebook's.
  const redraw = () => draw(model, el);
  const told = (message) => {
    if (message.do === "focus") {
      (el.querySelector("tr[aria-current]") ?? el.querySelector("tbody tr[tabindex]"))?.focus();
    }
  };
  model.on("change:view", redraw);
  model.on("msg:custom", told);
  redraw();
  return () => {
    model.off("change:view", redraw);
    model.off("msg:custom", told);
  };
}

export default { render };
