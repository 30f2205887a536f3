// Sees to what the page itself must do for the widgets around this one: keys, roles and names, the theme.

const REPAIRED = [
  ".widget-slider", ".widget-hprogress", ".widget-vprogress", ".widget-toggle-buttons", ".widget-radio",
].join(", ");

const set = (element, name, value) => {
  if (element && value !== null && element.getAttribute(name) !== value) element.setAttribute(name, value);
};

const name_slider = (widget, label) => {
  const handles = [...widget.querySelectorAll(".noUi-handle")];
  const readout = widget.querySelector(".widget-readout");
  handles.forEach((handle, place) => {
    const end = handles.length > 1 ? [", lower end", ", upper end"][place] : "";
    set(handle, "aria-label", label + end);
    if (readout && handles.length === 1) set(handle, "aria-valuetext", readout.textContent);
  });
  set(readout, "role", "textbox");
  set(readout, "aria-label", `${label}, type a value`);
};

const name_progress = (widget, label) => {
  const progress = widget.querySelector(".progress");
  const bar = widget.querySelector(".progress-bar");
  if (!progress || !bar) return;
  set(progress, "role", "progressbar");
  set(progress, "aria-label", label || "progress");
  set(progress, "aria-valuemin", "0");
  set(progress, "aria-valuemax", "100");
  set(progress, "aria-valuenow", String(Math.round(parseFloat(bar.style.width || bar.style.height) || 0)));
};

let groups = 0;
const name_choices = (widget, label) => {
  const is_radio = widget.matches(".widget-radio");
  set(widget, "role", is_radio ? "radiogroup" : "group");
  set(widget, "aria-label", label);
  for (const button of widget.querySelectorAll("button")) {
    set(button, "aria-pressed", String(button.classList.contains("mod-active")));
  }
  const inputs = [...widget.querySelectorAll("input[type=radio]")];
  if (inputs.some((input) => !input.name)) {
    const group = `oddsbench-group-${++groups}`; // without a common name, arrow keys do not move among them
    for (const input of inputs) input.name = group;
  }
};

const repair = (root) => {
  for (const widget of root.querySelectorAll(REPAIRED)) {
    const label = widget.querySelector(":scope > .widget-label")?.textContent.trim() || "";
    if (widget.matches(".widget-slider")) name_slider(widget, label);
    else if (widget.matches(".widget-toggle-buttons, .widget-radio")) name_choices(widget, label);
    else name_progress(widget, label);
  }
  for (const element of root.querySelectorAll('[title="null"]')) element.removeAttribute("title");
};

// Whoever catches keys for the notebook (`d d` deletes the cell that holds the bench) looks for this attribute
// between the focused element and the document. It is set for one event only, and not for Ctrl+S and its like.
const SUPPRESS = "data-lm-suppress-shortcuts";
const keep_keys = (root) => (event) => {
  const target = event.target;
  if (!(target instanceof Element) || !root.contains(target)) return;
  if ((event.ctrlKey || event.altKey || event.metaKey) && event.key !== "Enter") return;
  target.setAttribute(SUPPRESS, "true");
  setTimeout(() => target.removeAttribute(SUPPRESS), 0);
};

const is_dark = () => {
  const light = document.body.dataset.jpThemeLight;
  return light === undefined ? matchMedia("(prefers-color-scheme: dark)").matches : light === "false";
};

const watch_look = (model, signal) => {
  const tell = () => {
    const look = { is_dark: is_dark(), pixel_ratio: Math.min(3, Math.max(1, window.devicePixelRatio || 1)) };
    const news = Object.keys(look).filter((name) => model.get(name) !== look[name]);
    for (const name of news) model.set(name, look[name]);
    if (news.length) model.save_changes();
  };
  const observer = new MutationObserver(tell);
  observer.observe(document.body, { attributes: true, attributeFilter: ["data-jp-theme-light"] });
  signal.addEventListener("abort", () => observer.disconnect());
  matchMedia("(prefers-color-scheme: dark)").addEventListener("change", tell, { signal });
  window.addEventListener("resize", tell, { signal }); // also when moved to another screen, or zoomed
  tell();
};

const watch_root = (root, signal) => {
  let is_due = false;
  const later = () => {
    if (is_due) return;
    is_due = true;
    requestAnimationFrame(() => { is_due = false; repair(root); });
  };
  const observer = new MutationObserver(later);
  observer.observe(root, {
    subtree: true, childList: true, attributes: true, attributeFilter: ["class", "style", "title"],
  });
  signal.addEventListener("abort", () => observer.disconnect());
  window.addEventListener("keydown", keep_keys(root), { capture: true, signal });
  repair(root);
};

// A page that was loaded again no longer knows which output has which display id, so that nothing that the
// kernel updates would be saved. The notebook's model is then written to from here.
const rewrite = (model) => ({ key, bundle }) => {
  for (const cell of model.widget_manager?.context?.model?.cells ?? []) {
    for (let at = 0; at < (cell.outputs?.length ?? 0); at++) {
      const output = cell.outputs.get(at).toJSON();
      const text = [].concat(output.data?.["text/html"] ?? "").join("");
      if (text.includes(`${key}-saved`)) cell.outputs.set(at, { ...output, data: { ...output.data, ...bundle } });
    }
  }
};

function render({ model, el }) {
  const ended = new AbortController();
  el.style.display = "none";
  watch_look(model, ended.signal);
  const written = rewrite(model);
  model.on("msg:custom", written);
  ended.signal.addEventListener("abort", () => model.off("msg:custom", written));
  model.set("renderings", model.get("renderings") + 1);
  model.save_changes();
  const start = () => { // once the widget stands in the page
    if (ended.signal.aborted) return;
    const root = el.closest(".jp-OutputArea-output") || el.closest(".widget-container, .widget-box");
    if (root) watch_root(root, ended.signal);
    else setTimeout(start, 50);
  };
  start();
  return () => ended.abort();
}

export default { render };
