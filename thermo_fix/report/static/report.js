"use strict";
/* Reads temperatures off the pictures of the report.

   The numbers travel inside the page as 16-bit grey PNG files and are decoded here byte by byte,
   never through a canvas, so that no colour management can alter them. Nothing is fetched and
   nothing is stored. Without this script the page says all that matters.

   Words for things: a picture is drawn from a plane of numbers; the cursor is the pixel being
   read; a pin is a pixel kept for comparison; the line gives the profile. */
(() => {
  const SVG = "http://www.w3.org/2000/svg";
  const page = JSON.parse(document.getElementById("page-data").textContent);
  const words = page.words;
  const benches = new Map();

  // ------------------------------------------------------------ numbers in words

  const fill = (text, values) => text.replace(/\{(\w+)\}/g, (_, name) => values[name]);
  const written = (value, decimals) =>
    value.toFixed(decimals).replace(/^-(?=[0.]*$)/, "").replace("-", "\u2212")
      .replace(".", page.decimal);
  const toUnit = (celsius) => celsius * page.factor + page.zero;
  const toCelsius = (shown) => (shown - page.zero) / page.factor;
  const temperature = (celsius, decimals = 2) =>
    Number.isFinite(celsius)
      ? `${written(toUnit(celsius), decimals)}\u00a0${page.sign}`
      : words.no_temperature;

  /* Expanded uncertainty, two significant digits. */
  function expanded(u) {
    const value = page.coverage * u * page.factor;
    if (!(value > 0)) return Number.isFinite(value) ? `0\u00a0${page.difference}` : words.unknown;
    const decimals = Math.min(Math.max(1 - Math.floor(Math.log10(value)), 0), 3);
    return `${written(value, decimals)}\u00a0${page.difference}`;
  }

  const withSpread = (text, u) => (Number.isFinite(u) ? `${text} ±\u00a0${expanded(u)}` : text);

  // ------------------------------------------------------------ numbers of an image

  const bytesOf = (base64) => Uint8Array.from(atob(base64), (letter) => letter.charCodeAt(0));

  /* Grey values of a PNG of 8 or 16 bits (PNG specification, third edition, 5, 9 and 10). */
  async function decode(base64) {
    const bytes = bytesOf(base64);
    const view = new DataView(bytes.buffer);
    const parts = [];
    let width = 0, height = 0, size = 1;
    for (let at = 8; at < bytes.length; at += 12 + view.getUint32(at)) {
      const kind = String.fromCharCode(...bytes.subarray(at + 4, at + 8));
      if (kind === "IHDR") {
        width = view.getUint32(at + 8);
        height = view.getUint32(at + 12);
        size = bytes[at + 16] / 8;
      } else if (kind === "IDAT") {
        parts.push(bytes.subarray(at + 8, at + 8 + view.getUint32(at)));
      }
    }
    const unpacked = new Blob(parts).stream().pipeThrough(new DecompressionStream("deflate"));
    const raw = new Uint8Array(await new Response(unpacked).arrayBuffer());
    const length = width * size;
    const grey = new Uint16Array(width * height);
    let above = new Uint8Array(length);
    for (let row = 0, at = 0; row < height; row += 1) {
      const filter = raw[at];
      const line = raw.subarray(at + 1, at + 1 + length);
      at += 1 + length;
      unfilter(filter, line, above, size);
      for (let column = 0; column < width; column += 1) {
        grey[row * width + column] =
          size === 2 ? (line[2 * column] << 8) | line[2 * column + 1] : line[column];
      }
      above = line;
    }
    return grey;
  }

  function unfilter(filter, line, above, size) {
    for (let at = 0; at < line.length; at += 1) {
      const left = at < size ? 0 : line[at - size];
      const up = above[at];
      let guess = 0;
      if (filter === 1) guess = left;
      else if (filter === 2) guess = up;
      else if (filter === 3) guess = (left + up) >> 1;
      else if (filter === 4) guess = paeth(left, up, at < size ? 0 : above[at - size]);
      line[at] = (line[at] + guess) & 255;
    }
  }

  function paeth(left, up, corner) {
    const estimate = left + up - corner;
    const byLeft = Math.abs(estimate - left);
    const byUp = Math.abs(estimate - up);
    const byCorner = Math.abs(estimate - corner);
    if (byLeft <= byUp && byLeft <= byCorner) return left;
    return byUp <= byCorner ? up : corner;
  }

  async function values(plane) {
    const grey = await decode(plane.png);
    return Float64Array.from(grey, (count) =>
      count === 0 ? NaN : plane.offset + plane.step * (count - 1));
  }

  /* One image with everything that can be asked of a pixel. */
  async function open(key) {
    const given = JSON.parse(document.getElementById(`${key}n`).textContent);
    const planes = {};
    for (const [name, plane] of Object.entries(given.planes)) planes[name] = await values(plane);
    const labels = given.labels === null ? null : await decode(given.labels);
    const image = { ...given, planes, labels };
    const budget = (index) => image.budgets[labels === null ? 0 : labels[index]];

    /* Signed contributions to a pixel's temperature by variable; null where not known so. */
    function parts(index) {
      const found = budget(index);
      if (found === undefined) return null;
      const place = (planes.recorded[index] - found.low) / found.step;
      const result = new Map();
      for (const [name, nodes] of Object.entries(found.parts)) {
        const left = Math.min(Math.max(Math.floor(place), 0), nodes.length - 2);
        const one = nodes[left], other = nodes[left + 1];
        if (one === null || other === null) return null;
        result.set(name, one + (other - one) * (place - left));
      }
      return result.size ? result : null;
    }

    image.u = (index) => {
      const found = parts(index);
      if (found !== null) return Math.hypot(...found.values());
      return planes.uncertainty === undefined ? NaN : planes.uncertainty[index];
    };

    /* Standard uncertainty of the difference of two pixels. A variable of both is one variable:
       what it does to both cancels (JCGM 100:2008, 5.2.2). Without contributions only a bound is
       known: no correlation makes it more than the sum of both. */
    image.uDifference = (one, other) => {
      if (one === other) return { u: 0, bound: false };
      const first = parts(one), second = parts(other);
      if (first === null || second === null) {
        return { u: image.u(one) + image.u(other), bound: true };
      }
      const own = new Set([...budget(one).own, ...budget(other).own]);
      let variance = 0;
      for (const name of new Set([...first.keys(), ...second.keys()])) {
        const here = first.get(name) ?? 0, there = second.get(name) ?? 0;
        variance += own.has(name) ? here * here + there * there : (here - there) ** 2;
      }
      return { u: Math.sqrt(variance), bound: false };
    };
    image.apparent = (index) => (planes.apparent ?? planes.recorded)[index];
    image.emissivity = (index) =>
      planes.emissivity === undefined ? budget(index)?.emissivity ?? NaN : planes.emissivity[index];
    image.zone = (index) => budget(index)?.name ?? "";
    return image;
  }

  // ------------------------------------------------------------ drawing

  function draw(parent, name, attributes, text) {
    const element = document.createElementNS(SVG, name);
    for (const [key, value] of Object.entries(attributes)) element.setAttribute(key, value);
    if (text !== undefined) element.textContent = text;
    parent.append(element);
    return element;
  }

  /* A line that shows on any colour: dark below, light above. */
  function twice(parent, name, attributes, pen) {
    draw(parent, name, { ...attributes, class: "under", "stroke-width": 2.8 * pen });
    draw(parent, name, { ...attributes, class: "line", "stroke-width": 1.2 * pen });
  }

  /* Round numbers between two ends, on steps of 1, 2 or 5 times a power of ten. */
  function ticks(low, high, wanted = 6) {
    const rough = (high - low) / wanted;
    if (!(rough > 0)) return [];
    const power = 10 ** Math.floor(Math.log10(rough));
    const step = [1, 2, 5, 10].map((factor) => factor * power).find((one) => one >= rough);
    const decimals = Math.max(0, -Math.floor(Math.log10(step)));
    const result = [];
    for (let count = Math.ceil(low / step); count * step <= high; count += 1) {
      result.push({
        percent: (100 * (count * step - low)) / (high - low),
        text: written(count * step, decimals),
      });
    }
    return result;
  }

  const colours = new Map();
  function paletteOf(name) {
    if (!colours.has(name)) colours.set(name, bytesOf(page.maps[name]));
    return colours.get(name);
  }

  /* A plane in colours, as the address of a picture. The last two colours are greys for pixels
     without a temperature. */
  function picture(plane, image, look) {
    const palette = paletteOf(look.map);
    const most = palette.length / 3 - 3;
    const canvas = document.createElement("canvas");
    canvas.width = image.width;
    canvas.height = image.height;
    const context = canvas.getContext("2d");
    const pixels = context.createImageData(image.width, image.height);
    for (let index = 0; index < plane.length; index += 1) {
      const share = (plane[index] - look.low) / (look.high - look.low);
      let colour = Math.min(Math.max(Math.round(share * most), 0), most);
      if (Number.isNaN(share)) {
        const row = Math.floor(index / image.width);
        colour = most + ((row + (index % image.width)) % 6 < 2 ? 2 : 1);
      }
      pixels.data.set(palette.subarray(3 * colour, 3 * colour + 3), 4 * index);
      pixels.data[4 * index + 3] = 255;
    }
    context.putImageData(pixels, 0, 0);
    return canvas.toDataURL("image/png");
  }

  // ------------------------------------------------------------ the bench of one image

  class Bench {
    constructor(place) {
      this.key = place.dataset.bench;
      this.place = place;
      this.image = null;
      this.cursor = null;
      this.pins = [];
      this.base = 0;
      this.line = null;
      this.lineTool = false;
      place.append(document.getElementById("tools").content.cloneNode(true));
      const given = JSON.parse(document.getElementById(`${this.key}n`).textContent);
      this.own = { map: given.map, low: given.low, high: given.high };
      this.look = { ...this.own };
      this.size = { width: given.width, height: given.height };
      this.pen = given.width / 420;
      this.show = (name) => place.querySelector(`[data-show="${name}"]`);
      this.tool = (name) => place.querySelector(`[data-do="${name}"]`);
      this.originals = ["c", "r"].map((which) =>
        document.getElementById(this.key + which).getAttribute("href"));
      this.panes = [...document.querySelectorAll(`.picture[data-image="${this.key}"]`)].map(
        (holder) => this.addPane(holder));
      this.listen();
      this.showLook();
    }

    get keyboardPane() {
      return this.panes[0];
    }

    async ready() {
      this.opening ??= open(this.key).then((image) => {
        this.image = image;
      });
      await this.opening;
    }

    addPane(holder) {
      const pane = document.createElement("div");
      pane.className = "pane";
      const svg = draw(pane, "svg", {
        viewBox: `0 0 ${this.size.width} ${this.size.height}`, "aria-hidden": "true",
      });
      pane.svg = svg;
      if (holder.dataset.plane === "c") {
        pane.tabIndex = 0;
        pane.setAttribute("role", "application");
        const title = holder.closest("article").querySelector("h3").textContent.trim();
        pane.setAttribute("aria-label", fill(words.pane, { title }));
      }
      holder.append(pane);
      return pane;
    }

    listen() {
      for (const pane of this.panes) {
        pane.addEventListener("pointermove", (event) => this.move(event, pane));
        pane.addEventListener("pointerdown", (event) => this.press(event, pane));
        pane.addEventListener("pointerup", (event) => this.release(event, pane));
        pane.addEventListener("pointercancel", () => { this.drag = null; });
      }
      this.keyboardPane.addEventListener("keydown", (event) => this.type(event));
      this.keyboardPane.addEventListener("focus", () => this.ready().then(() => {
        if (this.cursor === null) this.goTo(this.size.width >> 1, this.size.height >> 1);
        this.speak();
      }));
      for (const name of ["corrected", "recorded"]) {
        this.tool(name).addEventListener("click", () => this.swap(name));
      }
      this.tool("line").addEventListener("click", () => this.useLine(!this.lineTool));
      this.tool("clear").addEventListener("click", () => this.clear());
      this.tool("reset").addEventListener("click", () => this.change(null));
      this.tool("map").addEventListener("change", () => this.changeByTools());
      this.tool("low").addEventListener("change", () => this.changeByTools());
      this.tool("high").addEventListener("change", () => this.changeByTools());
      this.tool("all").addEventListener("change", () => {
        if (this.tool("all").checked) this.change(this.look);
      });
      this.tool("base").addEventListener("change", (event) => {
        this.base = event.target.selectedIndex;
        this.showPins();
      });
    }

    // ---------------------------------------- pointer and keys

    pixelAt(event, pane) {
      const box = pane.getBoundingClientRect();
      const clamp = (value, most) => Math.min(Math.max(Math.floor(value), 0), most - 1);
      return [
        clamp(((event.clientX - box.left) / box.width) * this.size.width, this.size.width),
        clamp(((event.clientY - box.top) / box.height) * this.size.height, this.size.height),
      ];
    }

    async move(event, pane) {
      const [x, y] = this.pixelAt(event, pane);
      await this.ready();
      this.goTo(x, y);
      if (this.lineTool && this.drag) this.setLine(this.drag, [x, y]);
    }

    async press(event, pane) {
      if (event.button !== 0) return;
      this.drag = this.pixelAt(event, pane);
      this.pressedAt = [event.clientX, event.clientY];
      if (this.lineTool) pane.setPointerCapture(event.pointerId);
      const [x, y] = this.drag;
      await this.ready();
      this.goTo(x, y);
    }

    async release(event, pane) {
      if (!this.drag) return;
      const start = this.drag;
      const end = this.pixelAt(event, pane);
      const [x, y] = this.pressedAt;
      const still = Math.hypot(event.clientX - x, event.clientY - y) < 5;
      this.drag = null;
      await this.ready();
      if (!this.lineTool) {
        if (still) this.pin(...end);
      } else if (!still) {
        this.setLine(start, end);
      }
    }

    async type(event) {
      const step = event.shiftKey ? 10 : 1;
      const moves = {
        ArrowLeft: [-step, 0], ArrowRight: [step, 0], ArrowUp: [0, -step], ArrowDown: [0, step],
      };
      const does = {
        Enter: () => this.pin(...this.cursor),
        " ": () => this.pin(...this.cursor),
        l: () => this.lineKey(),
        L: () => this.lineKey(),
        Delete: () => this.unpin(this.pins.length - 1),
        Escape: () => this.clear(),
      };
      const move = moves[event.key];
      const act = does[event.key];
      if ((!move && !act) || event.ctrlKey || event.metaKey || event.altKey) return;
      event.preventDefault();
      await this.ready();
      if (this.cursor === null) this.goTo(this.size.width >> 1, this.size.height >> 1);
      if (act) {
        act();
        return;
      }
      const [x, y] = this.cursor;
      this.goTo(x + move[0], y + move[1]);
      if (this.lineStart) this.setLine(this.lineStart, this.cursor);
      this.speak();
    }

    lineKey() {
      if (this.lineStart) {
        this.setLine(this.lineStart, this.cursor);
        this.lineStart = null;
        this.say(this.show("profile").querySelector("figcaption")?.textContent ?? "");
      } else {
        this.lineStart = this.cursor;
        this.say(words.line_begun);
      }
    }

    // ---------------------------------------- reading

    index([x, y]) {
      return y * this.size.width + x;
    }

    goTo(x, y) {
      this.cursor = [
        Math.min(Math.max(x, 0), this.size.width - 1),
        Math.min(Math.max(y, 0), this.size.height - 1),
      ];
      this.show("readout").textContent = this.reading(this.cursor);
      this.drawOver();
    }

    reading(place) {
      const at = this.index(place);
      const { planes } = this.image;
      const zone = this.image.zone(at);
      const emissivity = this.image.emissivity(at);
      const values = {
        x: place[0],
        y: place[1],
        zone: zone ? fill(words.in_zone, { zone }) : "",
        corrected: withSpread(
          temperature(planes.corrected[at]),
          Number.isFinite(planes.corrected[at]) ? this.image.u(at) : NaN),
        apparent: temperature(this.image.apparent(at)),
        recorded: temperature(planes.recorded[at]),
        emissivity: Number.isFinite(emissivity) ? written(emissivity, 3) : words.unknown,
      };
      return fill(planes.apparent === undefined ? words.readout : words.readout_recorded, values);
    }

    speak() {
      this.say(this.reading(this.cursor));
    }

    say(text) {
      this.show("spoken").textContent = text;
    }

    // ---------------------------------------- pins

    pin(x, y) {
      if (this.pins.length === 26) return;
      this.pins.push([x, y]);
      this.showPins();
      this.say(fill(words.pinned, {
        name: this.nameOf(this.pins.length - 1), reading: this.reading([x, y]),
      }));
    }

    unpin(number) {
      if (number < 0) return;
      this.pins.splice(number, 1);
      if (this.base >= this.pins.length) this.base = 0;
      this.showPins();
    }

    nameOf(number) {
      return String.fromCharCode(65 + number);
    }

    clear() {
      this.pins = [];
      this.base = 0;
      this.line = null;
      this.lineStart = null;
      this.showPins();
      this.show("profile").hidden = true;
      this.show("profile").replaceChildren();
    }

    showPins() {
      const base = this.tool("base");
      base.replaceChildren(...this.pins.map((_, number) => new Option(this.nameOf(number))));
      base.selectedIndex = this.base;
      const body = this.show("points").querySelector("tbody");
      body.replaceChildren(...this.pins.map((place, number) => this.pinRow(place, number)));
      this.show("points").hidden = this.pins.length === 0;
      this.drawOver();
    }

    pinRow(place, number) {
      const row = document.createElement("tr");
      const at = this.index(place);
      const { planes } = this.image;
      const name = this.nameOf(number);
      const zone = this.image.zone(at);
      const emissivity = this.image.emissivity(at);
      const header = document.createElement("th");
      header.scope = "row";
      header.textContent = name;
      row.append(header);
      const cell = (text, className) => {
        const made = document.createElement("td");
        made.textContent = text;
        if (className) made.className = className;
        row.append(made);
        return made;
      };
      const value = planes.corrected[at];
      cell(`${place[0]}, ${place[1]}${zone ? ` (${zone})` : ""}`, "words");
      cell(Number.isFinite(value)
        ? withSpread(written(toUnit(value), 2), this.image.u(at)) : words.no_temperature, "num");
      const apparent = this.image.apparent(at);
      cell(Number.isFinite(apparent) ? written(toUnit(apparent), 2) : words.unknown, "num");
      cell(Number.isFinite(emissivity) ? written(emissivity, 3) : words.unknown, "num");
      cell(number === this.base ? words.is_base : this.differenceText(at), "num");
      const remove = document.createElement("button");
      remove.type = "button";
      remove.textContent = "\u00d7";
      remove.setAttribute("aria-label", fill(words.remove, { name }));
      remove.addEventListener("click", () => {
        this.unpin(number);
        this.keyboardPane.focus();
      });
      cell("").append(remove);
      return row;
    }

    differenceText(at) {
      const reference = this.index(this.pins[this.base]);
      const { corrected } = this.image.planes;
      const difference = (corrected[at] - corrected[reference]) * page.factor;
      if (!Number.isFinite(difference)) return words.unknown;
      const { u, bound } = this.image.uDifference(at, reference);
      const sign = difference > 0 ? "+" : "";
      const spread = Number.isFinite(u) ? expanded(u) : words.unknown;
      return `${sign}${written(difference, 2)} ±\u00a0` +
        (bound ? fill(words.at_most, { u: spread }) : spread);
    }

    // ---------------------------------------- profile

    useLine(on) {
      this.lineTool = on;
      this.tool("line").setAttribute("aria-pressed", String(on));
      for (const pane of this.panes) pane.classList.toggle("lining", on);
    }

    setLine(start, end) {
      this.line = [start, end];
      this.drawOver();
      this.showProfile();
    }

    showProfile() {
      const [[x0, y0], [x1, y1]] = this.line;
      const length = Math.hypot(x1 - x0, y1 - y0);
      const steps = Math.max(1, Math.ceil(length));
      const { planes } = this.image;
      const points = Array.from({ length: steps + 1 }, (_, step) => {
        const at = this.index([
          Math.round(x0 + ((x1 - x0) * step) / steps),
          Math.round(y0 + ((y1 - y0) * step) / steps),
        ]);
        const value = planes.corrected[at];
        const u = page.coverage * this.image.u(at);
        return { x: (100 * step) / steps, value, recorded: planes.recorded[at], u };
      });
      const known = points.filter((point) => Number.isFinite(point.value));
      const all = points.flatMap(({ value, recorded, u }) =>
        [value - u, value + u, value, recorded].filter(Number.isFinite));
      const figure = this.show("profile");
      figure.replaceChildren();
      figure.hidden = false;
      if (all.length === 0) return;
      const low = Math.min(...all), high = Math.max(...all, low + 0.2);
      const up = (celsius) => 100 - (100 * (celsius - low)) / (high - low);
      const path = (pick) => {
        let down = false;
        return points.map((point) => {
          const value = pick(point);
          const piece = Number.isFinite(value)
            ? `${down ? "L" : "M"}${point.x.toFixed(2)} ${up(value).toFixed(2)}` : "";
          down = Number.isFinite(value);
          return piece;
        }).join("");
      };
      const banded = known.filter((point) => Number.isFinite(point.u));
      const band = [
        ...banded.map((point) => `${point.x.toFixed(2)},${up(point.value + point.u).toFixed(2)}`),
        ...banded.reverse().map((point) =>
          `${point.x.toFixed(2)},${up(point.value - point.u).toFixed(2)}`),
      ].join(" ");
      const axes = document.createElement("div");
      axes.className = "axes";
      const plot = draw(axes, "svg", { class: "plot", width: "100%", height: 180 });
      const yTicks = ticks(toUnit(low), toUnit(high), 5);
      for (const tick of yTicks) {
        const y = `${100 - tick.percent}%`;
        draw(plot, "line", { class: "grid", x1: 0, x2: "100%", y1: y, y2: y });
      }
      const inner = draw(plot, "svg", {
        viewBox: "0 0 100 100", preserveAspectRatio: "none", width: "100%", height: "100%",
      });
      draw(inner, "polygon", { class: "band", points: band });
      draw(inner, "path", { class: "trace recorded", d: path((point) => point.recorded) });
      draw(inner, "path", { class: "trace", d: path((point) => point.value) });
      const axisY = draw(axes, "svg", { class: "axis-y", width: "100%", height: 180 });
      for (const tick of yTicks) {
        draw(axisY, "text", {
          x: "100%", dx: -6, dy: 4, y: `${100 - tick.percent}%`, "text-anchor": "end",
        }, tick.text);
      }
      const axisX = draw(axes, "svg", { class: "axis-x", width: "100%", height: 20 });
      const [whole, unit] = this.lengthOf(length);
      const xTicks = ticks(0, whole);
      xTicks.forEach((tick, number) => {
        const text = number === xTicks.length - 1 ? `${tick.text}\u00a0${unit}` : tick.text;
        draw(axisX, "text", {
          x: `${tick.percent}%`, y: 14, "text-anchor": tick.percent > 92 ? "end" : "middle",
        }, text);
      });
      figure.append(axes);
      const numbers = known.map((point) => point.value);
      const caption = document.createElement("figcaption");
      caption.textContent = fill(words.profile, {
        x0, y0, x1, y1,
        length: `${written(whole, unit === "px" ? 0 : 2)}\u00a0${unit}`,
        low: temperature(Math.min(...numbers), 1),
        high: temperature(Math.max(...numbers), 1),
        mean: temperature(numbers.reduce((sum, one) => sum + one, 0) / numbers.length, 1),
      });
      plot.setAttribute("role", "img");
      plot.setAttribute("aria-label", caption.textContent);
      for (const axis of [axisX, axisY]) axis.setAttribute("aria-hidden", "true");
      figure.append(caption);
    }

    lengthOf(pixels) {
      const metres = this.image.pixel === null ? NaN : pixels * this.image.pixel;
      if (!Number.isFinite(metres)) return [pixels, "px"];
      if (metres >= 1) return [metres, "m"];
      return metres >= 0.01 ? [metres * 100, "cm"] : [metres * 1000, "mm"];
    }

    // ---------------------------------------- drawing over the pictures

    drawOver() {
      for (const { svg } of this.panes) {
        svg.replaceChildren();
        if (this.line) {
          const [[x1, y1], [x2, y2]] = this.line.map(([x, y]) => [x + 0.5, y + 0.5]);
          twice(svg, "line", { x1, y1, x2, y2 }, this.pen);
        }
        this.pins.forEach(([x, y], number) => {
          twice(svg, "circle", { cx: x + 0.5, cy: y + 0.5, r: 3.2 * this.pen }, this.pen);
          draw(svg, "text", {
            class: "pin-name", x: x + 0.5 + 5 * this.pen, y: y + 0.5 - 4 * this.pen,
            "font-size": 12 * this.pen, "stroke-width": 3 * this.pen,
          }, this.nameOf(number));
        });
        if (this.cursor) {
          const [x, y] = this.cursor;
          const gap = 3 * this.pen + 0.5, arm = 9 * this.pen;
          const cx = x + 0.5, cy = y + 0.5;
          twice(svg, "path", {
            d: `M${cx - gap - arm} ${cy}h${arm}m${2 * gap} 0h${arm}` +
              `M${cx} ${cy - gap - arm}v${arm}m0 ${2 * gap}v${arm}`,
          }, this.pen);
          draw(svg, "rect", { class: "line", x, y, width: 1, height: 1,
            "stroke-width": 0.6 * this.pen });
        }
      }
    }

    // ---------------------------------------- colours

    swap(name) {
      for (const other of ["corrected", "recorded"]) {
        this.tool(other).setAttribute("aria-pressed", String(other === name));
      }
      const plane = document.getElementById(`${this.key}c`);
      plane.parentNode.querySelector(".swapped")?.remove();
      if (name === "recorded") {
        const over = document.createElementNS(SVG, "use");
        over.setAttribute("href", `#${this.key}r`);
        over.setAttribute("class", "swapped");
        plane.after(over);
      }
      document.querySelector(`[data-shown="${this.key}"]`).textContent =
        this.tool(name).textContent;
    }

    changeByTools() {
      const low = toCelsius(Number.parseFloat(this.tool("low").value));
      const high = toCelsius(Number.parseFloat(this.tool("high").value));
      const sound = Number.isFinite(low) && Number.isFinite(high) && high - low > 1e-6;
      const span = sound ? { low, high } : { low: this.look.low, high: this.look.high };
      this.change({ map: this.tool("map").value, ...span });
    }

    /* Takes a look, or with null its own; for all images where that is ticked. */
    async change(look) {
      const every = this.tool("all").checked ? [...benches.values()] : [this];
      for (const bench of every) {
        bench.look = { ...(look ?? bench.own) };
        await bench.paint();
      }
    }

    async paint() {
      this.showLook();
      const { own, look } = this;
      const same = own.map === look.map && own.low === look.low && own.high === look.high;
      if (!same) await this.ready();
      ["c", "r"].forEach((which, number) => {
        const plane = which === "c" ? "corrected" : "recorded";
        document.getElementById(this.key + which).setAttribute("href",
          same ? this.originals[number] : picture(this.image.planes[plane], this.image, look));
      });
      this.showScale();
    }

    showLook() {
      this.tool("map").value = this.look.map;
      const shown = (celsius) => String(Number(toUnit(celsius).toFixed(2)));
      this.tool("low").value = shown(this.look.low);
      this.tool("high").value = shown(this.look.high);
    }

    showScale() {
      const { look } = this;
      const palette = paletteOf(look.map);
      const most = palette.length / 3 - 3;
      const stops = document.getElementById(`${this.key}m`).querySelectorAll("stop");
      stops.forEach((stop, number) => {
        const colour = 3 * Math.round((number * most) / (stops.length - 1));
        stop.setAttribute("stop-color", `rgb(${palette.slice(colour, colour + 3).join(" ")})`);
      });
      const low = temperature(look.low, 1), high = temperature(look.high, 1);
      const scale = document.querySelector(`[data-scale="${this.key}"]`);
      scale.setAttribute("aria-label", fill(words.scale, { low, high }));
      scale.querySelectorAll("line, text").forEach((one) => one.remove());
      for (const tick of ticks(toUnit(look.low), toUnit(look.high))) {
        const x = `${tick.percent.toFixed(2)}%`;
        draw(scale, "line", { x1: x, x2: x, y1: 15, y2: 21 });
        draw(scale, "text", { x, y: 35, "text-anchor": "middle" }, tick.text);
      }
      for (const caption of document.querySelectorAll(`[data-ends="${this.key}"]`)) {
        caption.textContent = fill(words.ends, { low, high });
      }
    }
  }

  // ------------------------------------------------------------ the page

  if (typeof DecompressionStream === "function") {
    for (const place of document.querySelectorAll("[data-bench]")) {
      const bench = new Bench(place);
      benches.set(bench.key, bench);
    }
  } else {
    for (const place of document.querySelectorAll("[data-bench]")) {
      place.textContent = words.unsupported;
    }
  }

  // Paper shows what is folded away on the screen.
  let folded = [];
  addEventListener("beforeprint", () => {
    folded = [...document.querySelectorAll("details:not([open])")];
    for (const one of folded) one.open = true;
  });
  addEventListener("afterprint", () => {
    for (const one of folded) one.open = false;
  });
})();
