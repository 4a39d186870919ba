// Shows neutral figures with BokehJS. BokehJS comes from the kernel as one binary message and is kept once per version:
// Copyright (c) Anaconda, Inc., and Bokeh Contributors, BSD-3-Clause; its full notice is at the head of the file sent.

function loadBokeh(model) {
  const version = model.get("bokeh");
  const kept = (window.__propkitBokeh ??= {});
  if (!kept[version]) {
    kept[version] = new Promise((resolve, reject) => {
      const heard = (message, buffers) => {
        if (message.answer !== "bokeh" || message.version !== version) return;
        model.off("msg:custom", heard);
        try {
          const code = new TextDecoder().decode(buffers[0]);
          const home = {};
          new Function(code).call(home);
          resolve(home.Bokeh[version] ?? home.Bokeh);
        } catch (error) {
          delete kept[version];
          reject(error);
        }
      };
      model.on("msg:custom", heard);
      model.send({ ask: "bokeh" });
      setTimeout(() => {
        // no kernel answered: the static drawings stay, and the next display asks again
        model.off("msg:custom", heard);
        delete kept[version];
        reject(new Error("no kernel answered"));
      }, 30000);
    });
    kept[version].catch(() => {});
  }
  return kept[version];
}

function isDark() {
  const said = document.body?.dataset?.jpThemeLight;
  if (said !== undefined) return said === "false";
  return window.matchMedia?.("(prefers-color-scheme: dark)").matches ?? false;
}

function onTheme(act) {
  const watch = new MutationObserver(act);
  watch.observe(document.body, { attributes: true, attributeFilter: ["data-jp-theme-light", "data-jp-theme-name"] });
  return () => watch.disconnect();
}

function floats(view) {
  // a copy: float64 needs an aligned buffer
  const bytes = new Uint8Array(view.buffer, view.byteOffset, view.byteLength).slice();
  return new Float64Array(bytes.buffer);
}

function sourceData(described, numbers) {
  const made = {};
  for (const [column, what] of Object.entries(described)) {
    if (what.rows) {
      let at = what.rows[0];
      made[column] = what.rows.slice(1).map((length) => Array.from(numbers.subarray(at, (at += length))));
      continue;
    }
    const isPlace = what.length === 2 && typeof what[0] === "number";
    made[column] = isPlace ? Array.from(numbers.subarray(what[0], what[0] + what[1])) : what;
  }
  return made;
}

// New data without the announcement that makes a legend build itself anew: glyphs and labels hear the other signal.
function renew(source, data) {
  const same = (one, other) => one === other || (one.length === other.length && one.every((value, n) => Object.is(value, other[n])));
  const before = source.data;
  if (Object.keys(data).every((column) => before[column] !== undefined && same(data[column], before[column]))) return;
  source.setv({ data }, { silent: true });
  source.streaming.emit();
}

// Bokeh writes the style sheet of every part at every paint, and each write makes the page find all styles anew;
// the page's own copy of Bokeh writes only what differs. Without the inner name a plot is drawn all the same, only slower.
function spareStyles(plotView) {
  for (const view of plotView?.renderer_views?.values?.() ?? []) {
    const kind = view.position && Object.getPrototypeOf(view.position);
    if (!kind?._update || kind.__spared) continue;
    kind.__spared = true;
    kind._update = function (css) {
      if (this.el.textContent !== css) this.el.textContent = css;
    };
  }
}

// One figure on the page: a static drawing at first, the live plot once BokehJS is there.
class LiveFigure {
  constructor(model, place) {
    this.model = model;
    this.place = place;
    this.element = document.createElement("figure");
    this.element.className = "pk-figure";
    this.still = document.createElement("div");
    this.still.className = "pk-still";
    this.live = document.createElement("div");
    this.live.className = "pk-live";
    this.live.hidden = true;
    this.element.append(this.still, this.live);
    this.element.__propkit = this;
    this.key = null;
  }

  drawStill() {
    const svg = this.model.get("still")[this.place];
    if (this.live.hidden) this.still.innerHTML = svg ?? "";
  }

  async update(Bokeh) {
    const plot = this.model.get("plots")[this.place];
    const frame = this.model.get("frame")[this.place];
    if (!plot || !frame || plot.key !== frame.key) return;
    this.live.setAttribute("role", "img");
    this.live.setAttribute("aria-label", frame.alt);
    if (this.key !== plot) {
      this.key = plot;
      await this.build(Bokeh, plot);
    }
    if (this.key !== plot || !this.document) return;
    this.fill(this.model.get("frame")[this.place], floats(this.model.get("data")));
  }

  async build(Bokeh, plot) {
    this.clear();
    const target = document.createElement("div");
    target.style.minHeight = `${plot.height}px`;
    this.live.replaceChildren(target);
    this.live.hidden = false;
    this.still.hidden = true;
    const views = await Bokeh.embed.embed_item(structuredClone(plot.item), target);
    this.views = views;
    const plotView = (views.roots ?? [...views])[0];
    spareStyles(plotView);
    this.root = plotView.model;
    this.document = this.root.document;
    this.root.on_event("tap", (event) => this.element.dispatchEvent(new CustomEvent("pk-tap", { bubbles: true, detail: { x: event.x, y: event.y } })));
    this.paint();
  }

  fill(frame, numbers) {
    if (!frame || frame.key !== this.key.key) return;
    const root = this.root;
    frame.sources.forEach((described, layer) => {
      renew(this.document.get_model_by_name(`layer-${layer}`), sourceData(described, numbers));
    });
    for (const axis of ["x", "y"]) {
      const range = root[`${axis}_range`];
      const wanted = frame.limits[axis];
      if (range.type === "DataRange1d") continue;
      if (typeof wanted[0] === "string") {
        if (String(range.factors) !== String(wanted)) range.factors = wanted;
      } else if (range.start !== wanted[0] || range.end !== wanted[1]) {
        range.setv({ start: wanted[0], end: wanted[1], reset_start: wanted[0], reset_end: wanted[1] });
      }
    }
    if (root.title.text !== frame.title) root.title.text = frame.title;
    this.count = (this.count ?? 0) + 1;
  }

  paint() {
    if (!this.document) return;
    const colours = this.model.get("colours")[isDark() ? "dark" : "light"];
    for (const [id, property, role, vector] of this.key.painted) {
      const painted = this.document.get_model_by_id(id);
      if (painted) painted[property] = vector ? { value: colours[role] } : colours[role];
    }
  }

  clear() {
    try {
      this.views?.clear?.();
    } catch (error) {
      console.warn("propkit: a plot could not be cleared", error);
    }
    this.views = this.document = null;
  }
}

// All figures of a widget, in `element`; returns what stops it.
function hostFigures(model, element) {
  let figures = [];
  let bokeh = null;
  let going = true;
  let busy = false;
  let again = false;

  async function update() {
    if (!going) return;
    const count = model.get("plots").length;
    while (figures.length < count) {
      const figure = new LiveFigure(model, figures.length);
      figures.push(figure);
      element.append(figure.element);
    }
    while (figures.length > count) {
      const figure = figures.pop();
      figure.clear();
      figure.element.remove();
    }
    if (!bokeh) {
      figures.forEach((figure) => figure.drawStill());
      return;
    }
    if (busy) {
      again = true;
      return;
    }
    busy = true;
    try {
      do {
        again = false;
        for (const figure of [...figures]) await figure.update(bokeh);
      } while (again && going);
    } finally {
      busy = false;
    }
  }

  const events = ["change:plots", "change:frame", "change:data", "change:still"];
  let planned = false;
  const plan = () => {
    // the traits of one message arrive one by one: act once, when all of them are there
    if (planned) return;
    planned = true;
    queueMicrotask(() => {
      planned = false;
      update();
    });
  };
  events.forEach((name) => model.on(name, plan));
  const stopTheme = onTheme(() => figures.forEach((figure) => figure.paint()));
  update();
  loadBokeh(model).then(
    (loaded) => {
      bokeh = loaded;
      return update();
    },
    () => {},
  );
  return () => {
    going = false;
    events.forEach((name) => model.off(name, plan));
    stopTheme();
    figures.forEach((figure) => figure.clear());
    figures = [];
  };
}
