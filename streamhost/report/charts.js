"use strict";
// Zooming. The page is whole without it: what is drawn here is what the page holds already, at another part of the axes.
(() => {
  const charts = JSON.parse(document.getElementById("charts").textContent);
  const X_ROOM = 52, Y_ROOM = 28, NARROW = 4.6, GLYPH = 8.3, WIDE = 11, LABEL_APART = 16, MARKS_APART = 12, STRIP = 10, LEAST_DRAG = 6, LEAST_WIDE = 120, FARTHEST = 1e6, STEP = 0.8, SMALLEST = 1e-6;
  const NAMESPACE = "http://www.w3.org/2000/svg";
  const told = document.getElementById("told");

  // --- axes

  const forward = (axis, value) => axis.log ? Math.log10(value) : value;
  const backward = (axis, value) => axis.log ? 10 ** value : value;

  function place(axis, value, start, end) {
    const low = forward(axis, axis.low), high = forward(axis, axis.high);
    return start + (forward(axis, value) - low) / (high - low) * (end - start);
  }

  function valueAt(axis, pixel, start, end) {
    const low = forward(axis, axis.low), high = forward(axis, axis.high);
    return backward(axis, low + (pixel - start) / (end - start) * (high - low));
  }

  function niceStep(span, most) {
    const least = span / Math.max(most, 1), power = 10 ** Math.floor(Math.log10(least));
    return [1, 2, 5, 10].map(step => step * power).find(step => step >= least * (1 - 1e-9));
  }

  function logPlaces(low, high, decade, room) {
    const found = [], every = Math.max(1, Math.ceil(room / decade));
    for (let power = Math.floor(Math.log10(low)); power <= Math.ceil(Math.log10(high)); power += 1) {
      if (decade * 0.3 >= room) found.push(10 ** power, 2 * 10 ** power, 5 * 10 ** power);
      else if (power % every === 0) found.push(10 ** power);
    }
    return found.filter(each => each >= low * (1 - 1e-9) && each <= high * (1 + 1e-9));
  }

  function ticks(axis, pixels, room, unit) {
    const {low, high} = axis;
    if (axis.log && high / low >= 10) return texts(logPlaces(low, high, pixels / Math.log10(high / low), room), unit, null);
    const step = niceStep(Math.abs(high - low), pixels / room), places = [];
    for (let k = Math.ceil(Math.min(low, high) / step - 1e-9); k * step <= Math.max(low, high) + 1e-9 * step; k += 1)
      places.push(k * step);
    return texts(places, unit, Math.min(12, Math.max(0, -Math.floor(Math.log10(step) + 1e-9))));
  }

  function texts(places, unit, decimals) {
    return places.map((each, index) => {
      const thousands = unit === "Hz" && Math.abs(each) >= 1000, last = index === places.length - 1 ? unit : "";
      const shown = thousands ? (each / 1000).toFixed((decimals || 0) + 3).replace(/\.?0+$/, "") :
        decimals === null ? String(Number(each.toPrecision(6))) : each.toFixed(decimals);
      const text = Number(shown) ? shown.replace("-", "\u2212") : shown.replace("-", "");
      return [each, text + (thousands ? " k" : last ? " " : "") + last];
    });
  }

  function width(text) {
    return [...text].reduce((sum, each) => sum + (".,: il".includes(each) ? NARROW : "\u2212mMwW\u221e".includes(each) ? WIDE : GLYPH), 0);
  }

  // --- one chart

  function element(name, attributes, text) {
    const made = document.createElementNS(NAMESPACE, name);
    for (const [key, value] of Object.entries(attributes)) made.setAttribute(key, value);
    if (text !== undefined) made.textContent = text;
    return made;
  }

  class Chart {
    constructor(svg, data) {
      Object.assign(this, data);
      this.svg = svg;
      [this.left, this.top, this.right, this.bottom, this.wide, this.high] = data.box;
      this.whole = {x: [data.x.low, data.x.high], y: [data.y.low, data.y.high]};
      this.margins = {left: this.left, right: this.wide - this.right};
    }

    // As wide as its place on the page, so that texts keep their size; drawn again where that changed.
    fit() {
      const wide = Math.round(this.svg.getBoundingClientRect().width);
      if (wide < LEAST_WIDE || Math.abs(wide - this.wide) < 2) return;
      this.wide = wide;
      this.left = Math.min(this.margins.left, 0.42 * wide);
      this.right = wide - this.margins.right;
      this.svg.setAttribute("viewBox", `0 0 ${wide} ${this.high}`);
      const clip = this.svg.querySelector("clipPath rect");
      clip.setAttribute("x", this.left);
      clip.setAttribute("width", this.right - this.left);
      this.draw();
    }

    across(value) { return place(this.x, value, this.left, this.right); }
    down(value) { return place(this.y, value, this.bottom, this.top); }

    draw() {
      this.svg.querySelector(".scale").replaceChildren(...this.scale());
      this.svg.querySelector(".items").replaceChildren(...this.items.flatMap(item => this.item(item)));
      this.svg.querySelector(".words").replaceChildren(...this.words());
    }

    scale() {
      const {left, top, right, bottom} = this, made = [];
      let grid = "";
      for (const [value, text] of ticks(this.x, right - left, X_ROOM, this.x.unit)) {
        const x = this.across(value), over = x + width(text) / 2 > this.wide;
        grid += `M${x} ${top}V${bottom}`;
        made.push(element("text", {x: over ? this.wide - 1 : x, y: bottom + 17, "text-anchor": over ? "end" : "middle"}, text));
      }
      const rows = this.y.rows.map((name, row) => [row, this.shortened(name)]);
      for (const [value, text] of rows.length ? rows : ticks(this.y, bottom - top, Y_ROOM, "")) {
        const y = this.down(value);
        if (y < top - 1 || y > bottom + 1) continue;
        grid += `M${left} ${y}H${right}`;
        made.push(element("text", {x: left - 6, y: y + 4.5, "text-anchor": "end"}, text));
      }
      if (this.y.unit) made.push(element("text", {x: 0, y: 11}, this.y.unit));
      return [element("path", {class: "grid", d: grid}),
              element("path", {class: "frame", d: `M${left} ${top}V${bottom}H${right}`}), ...made];
    }

    shortened(name) {
      while (width(name) > this.left - 8 && name.length > 1) name = name.replace(/\u2026$/, "").slice(0, -1) + "\u2026";
      return name;
    }

    item(item) {
      if (item.kind === "line") return [element("path", {class: `line ${item.role}`, d: this.path(item)})];
      if (item.kind === "circle") return [element("path", {class: "circle", d: this.path(item)})];
      if (item.kind === "points") return [element("path", {class: `point ${item.shape}`, d: this.marks(item)})];
      return this.edge(item);
    }

    path({x, y}) {
      let d = "", pen = "M";
      for (let k = 0; k < x.length; k += 1) {
        const a = y[k] === null ? NaN : this.across(x[k]), b = this.down(y[k]);
        if (Number.isFinite(a) && Number.isFinite(b) && Math.abs(a) < FARTHEST) {
          d += `${pen}${a.toFixed(1)} ${Math.min(2 * this.high, Math.max(-this.high, b)).toFixed(1)}`;
          pen = "L";
        } else pen = "M";
      }
      return d;
    }

    marks({shape, x, y, mark}) {
      let last = -Infinity;
      return x.map((each, k) => [this.across(each), y[k] === null ? NaN : this.down(y[k])])
        .filter(([a, b]) => Math.abs(a) < 1e5 && Math.abs(b) < 1e5)
        .filter(([a]) => shape !== "lozenge" || (a - last >= MARKS_APART && (last = a, true)))
        .map(([a, b]) => `M${a} ${b}${mark}`).join("");
    }

    edge({axis, value, side}) {
      const {left, top, right, bottom} = this;
      if (axis === "y") {
        const y = Math.min(bottom, Math.max(top, this.down(value))), far = y - side * STRIP;
        return [element("path", {class: "hatched", d: `M${left} ${y}H${right}V${far}H${left}z`}),
                element("path", {class: "edge", d: `M${left} ${y}H${right}`})];
      }
      const x = Math.min(right, Math.max(left, this.across(value))), far = x + side * STRIP;
      return [element("path", {class: "hatched", d: `M${x} ${top}V${bottom}H${far}V${top}z`}),
              element("path", {class: "edge", d: `M${x} ${top}V${bottom}`})];
    }

    words() {
      const {left, top, right, bottom} = this, ends = [], made = [];
      for (const item of this.items) {
        if (item.kind === "line" && item.label) {
          for (let k = item.x.length - 1; k >= 0; k -= 1) {
            const a = this.across(item.x[k]);
            if (item.y[k] !== null && a >= left - 0.5 && a <= right + 0.5) {
              ends.push([Math.min(bottom - 4, Math.max(top + 6, this.down(item.y[k]))), item]);
              break;
            }
          }
        }
        if (item.kind === "edge" && item.word && item.axis === "y") {
          const y = this.down(item.value);
          if (y >= top && y <= bottom)
            made.push(element("text", {class: "limit", x: left + 4, y: y + (item.side > 0 ? 14 : -5)}, item.word));
        }
      }
      let least = top + 6;
      for (const end of ends.sort((a, b) => a[0] - b[0])) {
        end[0] = Math.max(end[0], least);
        least = end[0] + LABEL_APART;
      }
      const over = ends.length ? Math.max(0, ends[ends.length - 1][0] - bottom + 4) : 0;
      for (const [y, item] of ends)
        made.push(element("text", {class: item.role, x: right + 5, y: y - over + 4.5}, item.label));
      return made;
    }

    // The part of an axis between two shares of what is shown; never beyond its reach, never less than can be told apart.
    show(name, from, to) {
      const axis = this[name];
      if (axis.rows.length) return;
      const low = forward(axis, axis.low), high = forward(axis, axis.high);
      const least = forward(axis, axis.least), most = forward(axis, axis.most);
      const wide = Math.min(Math.max((to - from) * (high - low), SMALLEST * (most - least)), most - least);
      const start = Math.min(Math.max(low + (from + to) / 2 * (high - low) - wide / 2, least), most - wide);
      [axis.low, axis.high] = [backward(axis, start), backward(axis, start + wide)];
    }

    part(name) { return [this[name].low, this[name].high]; }
    take(name, [low, high]) { if (!this[name].rows.length) [this[name].low, this[name].high] = [low, high]; }
    said() {
      const name = axis => axis.rows.length ? "" :
        `${Number(axis.low.toPrecision(4))} to ${Number(axis.high.toPrecision(4))} ${axis.unit}`.replaceAll("-", "\u2212");
      return [name(this.x), name(this.y)].filter(Boolean).join(", ");
    }
  }

  // --- a figure: its charts move together

  function join(figure) {
    const joined = [...figure.querySelectorAll(".chart")].map(svg => new Chart(svg, charts[svg.dataset.key]));
    let waiting = 0;
    const drawn = chart => {
      for (const other of joined) {
        for (const name of ["x", "y"])
          if (String(other.whole[name]) === String(chart.whole[name])) other.take(name, chart.part(name));
      }
      cancelAnimationFrame(waiting);
      waiting = requestAnimationFrame(() => joined.forEach(each => each.draw()));
      told.textContent = chart.said();
    };
    for (const chart of joined) {
      chart.svg.addEventListener("keydown", event => byKey(event, chart) && (event.preventDefault(), drawn(chart)));
      chart.svg.addEventListener("dblclick", () => { whole(chart); drawn(chart); });
      chart.svg.addEventListener("pointerdown", event => byDrag(event, chart, drawn));
      chart.fit();
    }
    return joined;
  }

  function whole(chart) {
    chart.take("x", chart.whole.x);
    chart.take("y", chart.whole.y);
  }

  function byKey(event, chart) {
    if (event.ctrlKey || event.metaKey || event.altKey) return false;
    const zoom = (name, factor) => chart.show(name, 0.5 - factor / 2, 0.5 + factor / 2);
    const across = factor => { zoom("x", factor); if (chart.equal) zoom("y", factor); };
    const move = (name, share) => chart.show(name, share, 1 + share);
    const plain = {
      "+": () => across(STEP), "=": () => across(STEP), "-": () => across(1 / STEP), "0": () => whole(chart),
      "ArrowLeft": () => move("x", -0.1), "ArrowRight": () => move("x", 0.1),
      "ArrowUp": () => move("y", 0.1), "ArrowDown": () => move("y", -0.1),
    };
    const shifted = {
      "ArrowUp": () => chart.equal ? across(STEP) : zoom("y", STEP),
      "ArrowDown": () => chart.equal ? across(1 / STEP) : zoom("y", 1 / STEP),
    };
    const act = (event.shiftKey && shifted[event.key]) || plain[event.key];
    if (act) act();
    return Boolean(act);
  }

  function byDrag(event, chart, drawn) {
    if (event.pointerType === "touch" || event.button) return;
    const {svg, left, right, top, bottom} = chart;
    const point = each => {
      const frame = svg.getBoundingClientRect(), scale = chart.wide / frame.width;
      return [Math.min(right, Math.max(left, (each.clientX - frame.left) * scale)),
              Math.min(bottom, Math.max(top, (each.clientY - frame.top) * scale))];
    };
    const start = point(event), box = element("path", {class: "drag"});
    svg.setPointerCapture(event.pointerId);
    svg.append(box);
    const shape = end => {
      const flat = Math.abs(end[1] - start[1]) < 3 * LEAST_DRAG;
      const [y0, y1] = flat ? [top, bottom] : [start[1], end[1]].sort((a, b) => a - b);
      const [x0, x1] = [start[0], end[0]].sort((a, b) => a - b);
      return [x0, x1, y0, y1];
    };
    const moved = each => {
      const [x0, x1, y0, y1] = shape(point(each));
      box.setAttribute("d", `M${x0} ${y0}H${x1}V${y1}H${x0}z`);
    };
    const ended = each => {
      svg.removeEventListener("pointermove", moved);
      box.remove();
      let [x0, x1, y0, y1] = shape(point(each));
      if (each.type === "pointercancel" || x1 - x0 < LEAST_DRAG) return;
      if (chart.equal) [x0, x1, y0, y1] = inShape(chart, x0, x1, y0, y1);
      chart.show("x", (x0 - left) / (right - left), (x1 - left) / (right - left));
      chart.show("y", (bottom - y1) / (bottom - top), (bottom - y0) / (bottom - top));
      drawn(chart);
    };
    svg.addEventListener("pointermove", moved);
    svg.addEventListener("pointerup", ended, {once: true});
    svg.addEventListener("pointercancel", ended, {once: true});
  }

  // The least rectangle of the plot's own shape around another.
  function inShape({left, right, top, bottom}, x0, x1, y0, y1) {
    const share = Math.max((x1 - x0) / (right - left), (y1 - y0) / (bottom - top)) / 2;
    const x = (x0 + x1) / 2, y = (y0 + y1) / 2;
    return [x - share * (right - left), x + share * (right - left), y - share * (bottom - top), y + share * (bottom - top)];
  }

  // --- the page

  const all = [...document.querySelectorAll("figure")].flatMap(join);
  addEventListener("resize", () => all.forEach(chart => chart.fit()));
  document.body.classList.add("zoomable");
  const hint = document.getElementById("zooming");
  hint.textContent = "Zoom: drag in a figure, double-click for the whole. By keys, with a figure in focus (Tab): + \u2212 and "
    + "arrows, Shift with up and down for the other axis, 0 for the whole.";
  hint.hidden = false;

  // Sound begins low, and one at a time.
  const players = [...document.querySelectorAll("audio")];
  for (const player of players) {
    player.volume = 0.1;
    player.addEventListener("play", () => players.forEach(other => other === player || other.pause()));
  }
})();
