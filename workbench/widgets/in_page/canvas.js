// A picture that is painted once it is decoded, the newest first of all. What is under the pointer or the
// keyboard's mark is answered from a table in the page, without asking the kernel.

const PATIENCE = 1500; // ms that a picture in the other theme's colours is held back

const is_dark = () => {
  const light = document.body.dataset.jpThemeLight;
  return light === undefined ? matchMedia("(prefers-color-scheme: dark)").matches : light === "false";
};

function render({ model, el }) {
  const box = document.createElement("div");
  const picture = document.createElement("canvas");
  const mark = document.createElement("canvas");
  const caption = document.createElement("div");
  const readout = document.createElement("div");
  el.classList.add("oddsbench-canvas");
  box.className = "oddsbench-canvas-box";
  box.tabIndex = 0;
  box.setAttribute("role", "img");
  caption.className = "oddsbench-canvas-caption";
  readout.className = "oddsbench-canvas-readout";
  readout.setAttribute("role", "status");
  box.append(picture, mark, caption);
  el.append(box, readout);

  const began = performance.now();
  let newest = 0;
  const paint = async () => {
    const bytes = model.get("png");
    if (!bytes || !bytes.byteLength) return;
    const mine = ++newest;
    const sequence = model.get("sequence");
    const is_other = model.get("is_dark") !== is_dark();
    const image = await createImageBitmap(new Blob([bytes], { type: "image/png" }));
    if (is_other && !box.dataset.painted) {
      await new Promise((go) => setTimeout(go, Math.max(0, PATIENCE - (performance.now() - began))));
    }
    if (mine === newest) {
      if (picture.width !== image.width || picture.height !== image.height) {
        picture.width = image.width;
        picture.height = image.height;
      }
      picture.getContext("2d").drawImage(image, 0, 0);
      box.dataset.painted = String(sequence);
    }
    image.close();
  };

  const size = () => {
    const [width, height] = model.get("size");
    box.style.maxWidth = `${width}px`;
    box.style.aspectRatio = `${width} / ${height}`;
    mark.width = width;
    mark.height = height;
  };
  const words = () => {
    box.setAttribute("aria-label", model.get("alt"));
    box.classList.toggle("is-stale", model.get("is_stale"));
    caption.textContent = model.get("caption");
  };

  let place = -1; // of the row that is read out
  const pixel = (value) => {
    const { left, right, low, high, is_logarithmic } = model.get("readout");
    const share = is_logarithmic ? Math.log(value / low) / Math.log(high / low) : (value - low) / (high - low);
    return left + share * (right - left);
  };
  const read = () => {
    const { edges, rows, top, bottom } = model.get("readout");
    const pen = mark.getContext("2d");
    pen.clearRect(0, 0, mark.width, mark.height);
    if (place >= 0 && rows && place < rows.length) {
      const [from, to] = [pixel(edges[place]), pixel(edges[place + 1])];
      pen.fillStyle = "rgba(128, 128, 128, 0.25)";
      pen.fillRect(Math.min(from, to), top, Math.max(Math.abs(to - from), 1), bottom - top);
      readout.textContent = rows[place];
    } else {
      readout.textContent = "";
    }
  };
  const under = (event) => {
    const { edges, left, right, top, bottom } = model.get("readout");
    if (!edges) return -1;
    const frame = mark.getBoundingClientRect();
    const x = ((event.clientX - frame.left) * mark.width) / frame.width;
    const y = ((event.clientY - frame.top) * mark.height) / frame.height;
    if (x < left || x > right || y < top || y > bottom) return -1;
    for (let at = 0; at + 1 < edges.length; at++) {
      if (x >= pixel(edges[at]) && x < pixel(edges[at + 1])) return at;
    }
    return -1;
  };

  mark.addEventListener("pointermove", (event) => { place = under(event); read(); });
  mark.addEventListener("pointerleave", () => { place = -1; read(); });
  box.addEventListener("blur", () => { place = -1; read(); });
  box.addEventListener("keydown", (event) => {
    const last = (model.get("readout").rows || []).length - 1;
    const to = {
      ArrowRight: Math.min(place + 1, last), ArrowLeft: place < 0 ? last : Math.max(place - 1, 0),
      Home: Math.min(0, last), End: last, Escape: -1,
    };
    if (!(event.key in to) || event.ctrlKey || event.altKey || event.metaKey) return;
    event.preventDefault();
    place = to[event.key];
    read();
  });
  const followed = [
    ["sequence", paint], ["size", size], ["readout", read], ["alt", words], ["is_stale", words], ["caption", words],
  ].map(([name, call]) => [`change:${name}`, call]);
  for (const [event, call] of followed) model.on(event, call);
  size();
  words();
  paint();
  return () => { for (const [event, call] of followed) model.off(event, call); };
}

export default { render };
