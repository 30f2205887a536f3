// A number with a slider beside it. The page asks, the kernel decides: what is shown is always `value`, which
// only the kernel changes, and the slider's range is never a limit of the value.

const LOGARITHMIC_STEPS = 200;
let made = 0;

function render({ model, el }) {
  const id = `oddsbench-number-${++made}`;
  const label = document.createElement("label");
  const box = document.createElement("input");
  const unit = document.createElement("span");
  const slider = document.createElement("input");
  const problem = document.createElement("div");
  label.htmlFor = box.id = id;
  problem.id = `${id}-problem`;
  box.type = "text";
  box.inputMode = "decimal";
  box.autocomplete = "off";
  slider.type = "range";
  slider.min = "0";
  problem.setAttribute("role", "alert");
  for (const input of [box, slider]) input.setAttribute("aria-describedby", problem.id);
  el.classList.add("oddsbench-number");
  el.append(label, box, unit, slider, problem);

  // The slider runs over whole steps, so that a change of its range can't change the value.
  const scale = () => {
    const [low, high, step] = ["low", "high", "step"].map((name) => model.get(name));
    if (model.get("is_logarithmic")) {
      const ratio = Math.log(high / low);
      const of = (place) => Number((low * Math.exp((ratio * place) / LOGARITHMIC_STEPS)).toPrecision(4));
      return { steps: LOGARITHMIC_STEPS, of, at: (value) => (LOGARITHMIC_STEPS * Math.log(value / low)) / ratio };
    }
    const of = (place) => Number((low + place * step).toPrecision(12));
    return { steps: Math.round((high - low) / step), of, at: (value) => (value - low) / step };
  };

  let asked = 0; // number of the last request; older answers are not shown, or the slider would jump back
  let waiting = null;
  const send = () => {
    if (waiting === null) return;
    asked = Math.max(asked, model.get("answered")) + 1; // another view of it may have asked as well
    model.send({ asked: waiting, number: asked });
    waiting = null;
  };
  const ask = (value) => {
    const is_first = waiting === null;
    waiting = value;
    if (is_first) requestAnimationFrame(send); // one request a frame, the newest
  };

  const show = () => {
    const { steps, at } = scale();
    const value = model.get("value");
    const place = at(value);
    slider.max = String(steps);
    slider.value = String(Math.min(Math.max(Math.round(place), 0), steps)); // a text that is no number sets the middle
    slider.hidden = !model.get("has_slider");
    box.value = String(value);
    slider.setAttribute("aria-valuetext", `${value} ${model.get("unit")}`.trim());
    el.classList.toggle("is-beyond", !(place >= -1e-9 && place <= steps + 1e-9));
  };
  const words = () => {
    label.textContent = model.get("label");
    unit.textContent = model.get("unit");
    slider.setAttribute("aria-label", `${model.get("label")}, slider`);
    problem.textContent = model.get("problem");
    const is_wrong = String(model.get("problem") !== "");
    for (const input of [box, slider]) input.setAttribute("aria-invalid", is_wrong);
    el.title = model.get("help");
    box.disabled = slider.disabled = model.get("is_disabled");
  };
  const answered = () => {
    if (model.get("answered") >= asked && waiting === null) show();
  };

  slider.addEventListener("input", () => {
    const value = scale().of(Number(slider.value));
    box.value = String(value);
    slider.setAttribute("aria-valuetext", `${value} ${model.get("unit")}`.trim());
    ask(value);
  });
  const typed = () => {
    const text = box.value.trim().replace("−", "-");
    ask(text !== "" && Number.isFinite(Number(text)) ? Number(text) : text);
  };
  box.addEventListener("change", typed);
  box.addEventListener("keydown", (event) => {
    if (event.key === "Enter") typed(); // also when nothing changed: what was refused is asked again
  });
  asked = model.get("answered"); // a page that was loaded again goes on counting
  const followed = [
    [["value", "answered"], answered],
    [["low", "high", "step", "is_logarithmic", "has_slider", "unit"], show],
    [["label", "unit", "problem", "help", "is_disabled"], words],
  ].flatMap(([names, call]) => names.map((name) => [`change:${name}`, call]));
  for (const [event, call] of followed) model.on(event, call);
  words();
  show();
  return () => { for (const [event, call] of followed) model.off(event, call); };
}

export default { render };
