// The page's side of a panel: draws what the kernel says, and tells the kernel what a person does.

const h = (tag, attributes = {}, ...children) => {
  const element = document.createElement(tag);
  for (const [name, value] of Object.entries(attributes)) {
    if (value === null || value === undefined || value === false) continue;
    if (name.startsWith("on")) element.addEventListener(name.slice(2), value);
    else if (name === "html") element.innerHTML = value;
    else element.setAttribute(name, value === true ? "" : value);
  }
  element.append(...children.filter((child) => child !== null && child !== undefined));
  return element;
};

// One per widget model: asks the kernel one thing at a time; while it works, only the newest move of a slider waits.
class Line {
  constructor(model) {
    this.model = model;
    this.client = Math.random().toString(36).slice(2);
    this.sent = 0;
    this.waiting = [];
    this.open = null;
    this.listeners = new Set();
    // what is shown comes in the same message: first that, then the next question
    model.on("change:ack", () => queueMicrotask(() => this.acknowledged()));
    model.on("comm_live_update", () => this.tell());
  }

  ask(what) {
    if (what.do === "slide") {
      this.waiting = this.waiting.filter((other) => !(other.do === "slide" && other.path === what.path));
    }
    this.waiting.push(what);
    this.next();
  }

  next() {
    if (this.open || !this.waiting.length) {
      this.tell();
      return;
    }
    const what = this.waiting.shift();
    this.sent += 1;
    this.open = { number: this.sent, since: performance.now(), path: what.path, do: what.do };
    try {
      this.model.send({ ...what, client: this.client, number: this.sent });
    } catch {
      // the kernel was stopped or started anew: nobody can answer
      this.dead = true;
      this.open = null;
      this.waiting = [];
      this.tell();
      return;
    }
    clearTimeout(this.timer);
    this.timer = setTimeout(() => this.tell(), 1500);
    this.tell();
  }

  acknowledged() {
    const ack = this.model.get("ack");
    if (ack.client !== this.client || !this.open || ack.number < this.open.number) return;
    clearTimeout(this.timer);
    this.open = null;
    this.next();
  }

  moves(path) {
    return [this.open, ...this.waiting].some((what) => what?.path === path && what.do === "slide");
  }

  get slow() {
    return this.open && performance.now() - this.open.since > 1400;
  }

  tell() {
    this.listeners.forEach((listener) => listener());
  }
}

const lines = new WeakMap();
const lineOf = (model) => {
  if (!lines.has(model)) lines.set(model, new Line(model));
  return lines.get(model);
};

const NARROW = 760;
const GONE = "No kernel is behind this panel any more. Run its cell again to make it live; the sheet above is that of its last execution.";
let unique = 0;

// One control: built once for its path and style, then only brought up to date.
class ControlView {
  constructor(line, spec) {
    this.line = line;
    this.path = spec.path;
    this.shape = ControlView.shape(spec);
    const id = `pk-${(unique += 1)}`;
    this.id = id;
    this.element = h("div", { class: "pk-control", "data-path": spec.path });
    this.label = h("label", { for: `${id}-field`, class: "pk-label" });
    this.group = spec.group ? this.buildGroup(id) : null;
    this.field = spec.style === "choice" ? this.buildChoice(id) : this.buildText(id, spec);
    this.slider = spec.slider ? this.buildSlider(id) : null;
    this.resetButton = h("button", { type: "button", class: "pk-reset", onclick: () => line.ask({ do: "reset", path: this.path }) }, "↺");
    this.note = h("span", { class: "pk-note" });
    this.error = h("p", { class: "pk-error", id: `${id}-error`, role: "alert" });
    this.doc = h("span", { class: "pk-hidden", id: `${id}-doc` });
    this.field.setAttribute("aria-describedby", `${id}-doc ${id}-error`);
    const head = h("div", { class: "pk-head" }, this.label, this.group, this.note);
    if (this.group) head.classList.add("pk-grouped");
    this.element.append(head, h("div", { class: "pk-edit" }, this.slider, this.field, this.resetButton), this.error, this.doc);
  }

  static shape(spec) {
    return JSON.stringify([spec.path, spec.style, Boolean(spec.slider), spec.group?.key ?? "", spec.suggestions]);
  }

  buildGroup(id) {
    const select = h("select", { class: "pk-member", id: `${id}-member`, onchange: () => this.line.ask({ do: "member", key: this.spec.group.key, member: select.value }) });
    this.member = select;
    return select;
  }

  buildChoice(id) {
    return h("select", { id: `${id}-field`, class: "pk-choice", onchange: () => this.line.ask({ do: "choose", path: this.path, choice: this.field.value }) });
  }

  buildText(id, spec) {
    const field = h("input", { type: "text", id: `${id}-field`, class: "pk-text", autocomplete: "off", spellcheck: "false", list: spec.suggestions.length ? `${id}-list` : null });
    field.addEventListener("change", () => this.commit());
    field.addEventListener("keydown", (event) => {
      if (event.key === "Enter") this.commit();
      if (event.key === "Escape") {
        field.value = this.spec.text;
        this.touched = false;
      }
      event.stopPropagation();
    });
    field.addEventListener("input", () => {
      this.touched = true;
    });
    if (spec.suggestions.length) {
      this.element.append(h("datalist", { id: `${id}-list` }, ...spec.suggestions.map((text) => h("option", { value: text }))));
    }
    return field;
  }

  commit() {
    if (!this.touched) return;
    this.touched = false;
    this.line.ask({ do: "type", path: this.path, text: this.field.value });
  }

  buildSlider(id) {
    const slider = h("input", { type: "range", class: "pk-slider", id: `${id}-slider` });
    const move = (phase) => {
      if (phase === "drag") this.run ??= `${this.line.client}-${(unique += 1)}`;
      this.line.ask({ do: "slide", path: this.path, at: slider.valueAsNumber, phase, run: this.run ?? "" });
      if (phase === "end") this.run = null;
    };
    slider.addEventListener("input", () => move("drag"));
    slider.addEventListener("change", () => move("end"));
    slider.addEventListener("keydown", (event) => event.stopPropagation());
    return slider;
  }

  update(spec) {
    this.spec = spec;
    const symbol = spec.symbol ? ` <span class="pk-symbol">${spec.symbol}</span>` : "";
    const markup = `<span class="pk-mark pk-${spec.kind}" aria-hidden="true"></span>`;
    if (this.member) {
      setMarkup(this.label, `${markup}<span class="pk-hidden">${escapeText(spec.group.label)}</span>`);
      setAttribute(this.label, "for", this.member.id);
      setOptions(this.member, spec.group.members, spec.group.member);
      setAttribute(this.field, "aria-label", spec.label);
    } else {
      setMarkup(this.label, `${markup}${escapeText(spec.label)}${symbol}`);
    }
    setText(this.doc, `${spec.doc} ${spec.kind === "given" ? "Given." : "Default."}`);
    setAttribute(this.element, "title", spec.doc);
    if (spec.style === "choice") setOptions(this.field, spec.choices, spec.choice);
    else {
      setAttribute(this.field, "placeholder", spec.placeholder);
      if (this.field.readOnly !== (spec.style === "fixed")) this.field.readOnly = spec.style === "fixed";
      const editing = this.touched && this.field === this.field.getRootNode().activeElement;
      if (!editing && this.field.value !== spec.text) this.field.value = spec.text;
    }
    if (this.slider && spec.slider) this.updateSlider(spec);
    const label = spec.reset;
    this.resetButton.disabled = !label;
    setAttribute(this.resetButton, "title", label || "Nothing to reset");
    setAttribute(this.resetButton, "aria-label", `${spec.label}: ${label || "nothing to reset"}`);
    setText(this.note, spec.note);
    setText(this.error, spec.error);
    this.element.classList.toggle("pk-refused", Boolean(spec.error));
    setAttribute(this.field, "aria-invalid", spec.error ? "true" : "false");
  }

  updateSlider(spec) {
    const { low, high, step, at } = spec.slider;
    for (const [name, value] of [["min", low], ["max", high], ["step", step]]) {
      if (Number(this.slider.getAttribute(name)) !== value) this.slider.setAttribute(name, value);
    }
    if (!this.line.moves(this.path)) this.slider.value = at;
    setAttribute(this.slider, "aria-label", spec.label);
    setAttribute(this.slider, "aria-valuetext", spec.text);
  }

  // when the kernel has answered everything, the slider stands where the kernel says
  settle() {
    const at = this.spec?.slider?.at;
    if (this.slider && at !== undefined && this.slider.valueAsNumber !== at) this.slider.value = at;
  }
}

// The page is touched only where something differs: every needless write costs a new layout.
function setText(element, text) {
  if (element.textContent !== text) element.textContent = text;
}

function setAttribute(element, name, value) {
  if (element.getAttribute(name) !== value) element.setAttribute(name, value);
}

// Markup of the same tags as before changes only the texts that differ: numbers move, the page is not built anew.
const TAGS = /<[^>]*>/g;
const ENTITIES = { "&amp;": "&", "&lt;": "<", "&gt;": ">", "&quot;": '"', "&nbsp;": "\u00a0" };

function setMarkup(element, markup) {
  const before = element.__markup;
  if (before === markup) return;
  element.__markup = markup;
  if (before === undefined || !changeTexts(element, before, markup)) element.innerHTML = markup;
}

function changeTexts(element, before, markup) {
  if (String(before.match(TAGS)) !== String(markup.match(TAGS))) return false;
  const [old, now] = [before.split(TAGS), markup.split(TAGS)];
  if (old.some((text, n) => Boolean(text) !== Boolean(now[n]))) return false;
  const walker = document.createTreeWalker(element, NodeFilter.SHOW_TEXT);
  for (let n = 0; n < now.length; n++) {
    if (!now[n]) continue;
    const node = walker.nextNode();
    if (!node) return false;
    if (old[n] !== now[n]) node.data = now[n].replace(/&(amp|lt|gt|quot|nbsp);/g, (entity) => ENTITIES[entity]);
  }
  return true;
}

// What is folded away is written when it is unfolded.
function fillFold(box, body, markup) {
  if (!box.__fill) box.addEventListener("toggle", () => box.open && box.__fill());
  box.__fill = () => setMarkup(body, markup());
  if (box.open) box.__fill();
}

function escapeText(text) {
  return String(text).replaceAll("&", "&amp;").replaceAll("<", "&lt;").replaceAll(">", "&gt;");
}

function quoted(text) {
  return escapeText(text).replaceAll('"', "&quot;");
}

function setOptions(select, options, chosen) {
  const key = JSON.stringify(options);
  if (select.__options !== key) {
    select.__options = key;
    select.replaceChildren(...options.map(([value, label]) => h("option", { value }, label)));
  }
  if (select.value !== chosen) select.value = chosen;
}

// A number is set in two parts, so that a column of numbers stands on its decimal signs.
function numberCell(text) {
  const point = text.indexOf(".");
  const isNumber = /^[−+\-±<]?\d/.test(text);
  if (!isNumber) return `<span class="pk-words">${escapeText(text)}</span>`;
  const whole = point < 0 ? text : text.slice(0, point);
  const rest = point < 0 ? "" : text.slice(point);
  return `<span class="pk-whole">${escapeText(whole)}</span><span class="pk-rest">${escapeText(rest)}</span>`;
}

function rowMarkup(row, compared) {
  const doubts = row.doubts.map((doubt) => ` <span class="pk-doubt" role="img" title="${quoted(doubt)}" aria-label="${quoted(doubt)}">△</span>`).join("");
  const symbol = row.symbol ? `<span class="pk-symbol">${row.symbol}</span>` : "";
  const steps = compared ? `<td class="pk-number pk-step">${numberCell(row.difference ?? "")}</td><td class="pk-share">${escapeText(row.share ?? "")}</td>` : "";
  return `<tr data-name="${escapeText(row.name)}"><th scope="row">${escapeText(row.label)} ${symbol}${doubts}</th>` +
    `<td class="pk-number">${numberCell(row.text)}</td><td class="pk-unit">${escapeText(row.unit)}</td>${steps}</tr>`;
}

function tableMarkup(rows, compared, baseline) {
  const head = compared
    ? `<thead><tr><th scope="col">Result</th><th scope="col" colspan="2">Now</th><th scope="col" colspan="2">Less ${escapeText(baseline)}</th></tr></thead>`
    : "";
  return `<table class="pk-results">${head}<tbody>${rows.map((row) => rowMarkup(row, compared)).join("")}</tbody></table>`;
}

function headlineMarkup(rows, compared) {
  return rows
    .map((row) => {
      const step = compared && row.difference ? `<span class="pk-delta">${escapeText(row.difference)} · ${escapeText(row.share ?? "")}</span>` : "";
      return `<div class="pk-answer" data-name="${escapeText(row.name)}"><span class="pk-what">${escapeText(row.label)} <span class="pk-symbol">${row.symbol}</span></span>` +
        `<span class="pk-figure-of"><b>${escapeText(row.text)}</b> <span class="pk-unit">${escapeText(row.unit)}</span></span>${step}</div>`;
    })
    .join("");
}

function stationsMarkup(table) {
  const heads = table.columns
    .map((column) => `<th scope="col">${escapeText(column.label)}<br><span class="pk-symbol">${column.symbol}</span> <span class="pk-unit">${escapeText(column.unit)}</span></th>`)
    .join("");
  const lines = table.index
    .map((name, line) => `<tr><th scope="row">${escapeText(name)}</th>${table.columns.map((column) => `<td class="pk-number">${numberCell(column.texts[line])}</td>`).join("")}</tr>`)
    .join("");
  return `<table class="pk-table"><thead><tr><th scope="col">Station</th>${heads}</tr></thead><tbody>${lines}</tbody></table>`;
}

function pinsMarkup(pins) {
  const heads = pins.names.map((name) => `<th scope="col">${escapeText(name)}</th>`).join("");
  const lines = pins.rows
    .map((row) => `<tr><th scope="row">${escapeText(row.label)} <span class="pk-symbol">${row.symbol}</span></th><td class="pk-unit">${escapeText(row.unit)}</td>` +
      `${row.texts.map((text) => `<td class="pk-number">${numberCell(text)}</td>`).join("")}</tr>`)
    .join("");
  return `<table class="pk-table"><thead><tr><th scope="col">Result</th><th scope="col">Unit</th><th scope="col">Now</th>${heads}</tr></thead><tbody>${lines}</tbody></table>`;
}

class PanelView {
  constructor(model, el) {
    this.model = model;
    this.line = lineOf(model);
    this.controls = new Map();
    this.sets = new Map();
    this.build(el);
    this.draw = () => this.update();
    this.listen = () => this.state();
    model.on("change:shown", this.draw);
    this.line.listeners.add(this.listen);
    this.update();
    this.stopFigures = hostFigures(model, this.figures);
    this.hideTwin(el);
    this.watchWidth();
  }

  ask(what) {
    this.line.ask(what);
  }

  build(el) {
    const button = (name, label, title, act) => (this[name] = h("button", { type: "button", class: "pk-button", title, onclick: act }, label));
    this.kind = h("span", { class: "pk-kind" });
    this.name = h("span", { class: "pk-name" });
    this.status = h("div", { class: "pk-status", role: "status", "aria-live": "polite" });
    const system = (units) => (this[`units${units}`] = h("button", { type: "button", title: `Show ${units} units`, onclick: () => this.ask({ do: "units", units }) }, units));
    const bar = h(
      "div",
      { class: "pk-bar", role: "toolbar", "aria-label": "Panel" },
      button("undo", "Undo", "Undo the last change", () => this.ask({ do: "undo" })),
      button("redo", "Redo", "Redo what was undone", () => this.ask({ do: "redo" })),
      button("pin", "Pin", "Keep this design as the baseline to compare with", () => this.ask({ do: "pin" })),
      button("unpin", "Unpin", "Let go of every pin", () => this.ask({ do: "unpin" })),
      h("div", { class: "pk-switch", role: "group", "aria-label": "Units of the display" }, system("SI"), system("US")),
    );
    this.inputs = h("div", { class: "pk-inputs" });
    this.headline = h("div", { class: "pk-headline" });
    this.tabs = h("div", { class: "pk-tabs", role: "group", "aria-label": "Figure shown" });
    this.figures = h("div", { class: "pk-figures" });
    this.figures.addEventListener("pk-tap", (event) => this.model.get("shown").facts && this.ask({ do: "tap", ...event.detail }));
    this.facts = h("ul", { class: "pk-facts" });
    this.actions = h("div", { class: "pk-actions" });
    this.figureError = h("p", { class: "pk-error" });
    this.results = h("div", { class: "pk-block" });
    this.doubts = h("ul", { class: "pk-doubts" });
    this.details = {};
    const fold = (key, title, open = false) => {
      const body = h("div", { class: "pk-fold-body" });
      const box = h("details", { class: "pk-fold", open }, h("summary", {}, title), body);
      this.details[key] = { box, body, summary: box.firstChild };
      return box;
    };
    this.code = h("code");
    this.copy = h("button", { type: "button", class: "pk-button", onclick: () => this.copyCode() }, "Copy the code");
    this.copied = h("span", { class: "pk-note", role: "status" });
    this.above = h("div", { class: "pk-above" });
    this.root = h(
      "section",
      { class: "pk-root pk-panel" },
      h("header", { class: "pk-strip" }, h("div", { class: "pk-title" }, this.kind, this.name), bar),
      this.status,
      h(
        "div",
        { class: "pk-body" },
        this.inputs,
        h("div", { class: "pk-outcome" }, this.headline, this.doubts, this.tabs, this.figures, this.figureError, this.facts, this.actions, this.results, fold("pins", "Pinned designs side by side"), fold("stations", "Stations"), this.above, fold("code", "Code that reproduces this")),
      ),
    );
    this.details.code.body.append(h("pre", { class: "pk-code", tabindex: "0" }, this.code), this.copy, this.copied);
    this.root.addEventListener("keydown", (event) => this.keys(event));
    el.append(this.root);
  }

  keys(event) {
    if (event.key === "Enter" || event.key.startsWith("Arrow") || /^[a-z ]$/i.test(event.key)) event.stopPropagation();
    if (event.target.matches("input[type=text]")) return;
    const held = event.ctrlKey || event.metaKey;
    if (held && event.key.toLowerCase() === "z") {
      this.ask({ do: event.shiftKey ? "redo" : "undo" });
      event.preventDefault();
      event.stopPropagation();
    } else if (held && event.key.toLowerCase() === "y") {
      this.ask({ do: "redo" });
      event.preventDefault();
      event.stopPropagation();
    }
  }

  update() {
    const shown = this.model.get("shown");
    if (!shown?.sets) return;
    const compared = shown.pins.names.length > 0;
    setText(this.kind, shown.title);
    setText(this.name, shown.name);
    setAttribute(this.root, "aria-label", `${shown.title}: ${shown.name}`);
    this.root.classList.toggle("pk-stale", !shown.current);
    this.undo.disabled = !shown.undo;
    this.redo.disabled = !shown.redo;
    this.unpin.hidden = !compared;
    for (const units of ["SI", "US"]) setAttribute(this[`units${units}`], "aria-pressed", units === shown.units ? "true" : "false");
    this.updateSets(shown.sets);
    setMarkup(this.headline, headlineMarkup(shown.headline, compared));
    setMarkup(this.results, tableMarkup(shown.results, compared, shown.pins.baseline));
    setMarkup(this.doubts, shown.doubts.map((doubt) => `<li>${escapeText(doubt)}</li>`).join(""));
    setMarkup(this.facts, (shown.facts ?? []).map((fact) => `<li>${escapeText(fact)}</li>`).join(""));
    this.updateActions(shown.actions ?? []);
    this.updateTabs(shown.figures);
    this.figures.hidden = Boolean(shown.figures.error);
    this.updateFold("pins", compared, () => pinsMarkup(shown.pins));
    this.updateFold("stations", Boolean(shown.stations), () => stationsMarkup(shown.stations));
    this.updateAbove(shown.above, compared, shown.pins.baseline);
    setText(this.code, shown.code);
    this.state();
  }

  state() {
    this.root.toggleAttribute("data-busy", Boolean(this.line.open));
    if (!this.line.open) this.controls.forEach((view) => view.settle());
    const shown = this.model.get("shown");
    const words = this.line.dead ? GONE : this.line.slow ? "Waiting for the kernel …" : (shown.status ?? "");
    if (this.line.dead) this.showTwin?.();
    setText(this.status, words);
    this.root.classList.toggle("pk-waiting", Boolean(this.line.slow));
  }

  updateSets(sets) {
    const kept = new Set();
    for (const set of sets) {
      let box = this.sets.get(set.kind);
      if (!box) {
        const main = h("div", { class: "pk-controls" });
        const minor = h("div", { class: "pk-controls" });
        const more = h("details", { class: "pk-more" }, h("summary", {}, "More inputs"), minor);
        box = { element: h("fieldset", { class: "pk-set", "data-kind": set.kind }, h("legend", {}, set.title), main, more), main, minor, more };
        this.sets.set(set.kind, box);
        this.inputs.append(box.element);
      }
      box.more.hidden = set.minor.length === 0;
      for (const [place, specs] of [[box.main, set.controls], [box.minor, set.minor]]) {
        const elements = specs.map((spec) => {
          kept.add(spec.path);
          let view = this.controls.get(spec.path);
          if (!view || view.shape !== ControlView.shape(spec)) {
            view?.element.remove();
            view = new ControlView(this.line, spec);
            this.controls.set(spec.path, view);
          }
          view.update(spec);
          return view.element;
        });
        const same = elements.length === place.children.length && elements.every((element, n) => element === place.children[n]);
        if (!same) this.place(place, elements);
      }
    }
    for (const [path, view] of this.controls) {
      if (!kept.has(path)) {
        view.element.remove();
        this.controls.delete(path);
      }
    }
  }

  place(box, elements) {
    const focused = box.getRootNode().activeElement;
    const holder = elements.find((element) => element.contains(focused));
    box.replaceChildren(...elements);
    if (holder && focused !== box.getRootNode().activeElement) focused.focus();
  }

  updateTabs(figures) {
    const key = JSON.stringify(figures.titles);
    if (this.tabs.__key !== key) {
      this.tabs.__key = key;
      this.tabs.replaceChildren(...figures.titles.map((title, at) => h("button", { type: "button", class: "pk-tab", onclick: () => this.ask({ do: "figure", at }) }, title)));
    }
    [...this.tabs.children].forEach((tab, at) => setAttribute(tab, "aria-pressed", at === figures.at ? "true" : "false"));
    this.tabs.hidden = figures.titles.length < 2;
    setText(this.figureError, figures.error ?? "");
  }

  updateActions(actions) {
    const key = JSON.stringify(actions);
    if (this.actions.__key === key) return;
    this.actions.__key = key;
    this.actions.replaceChildren(...actions.map(([what, label, title]) => h("button", { type: "button", class: "pk-button", title, onclick: () => this.ask({ do: "press", what }) }, label)));
  }

  updateFold(key, there, markup) {
    const { box, body } = this.details[key];
    box.hidden = !there;
    fillFold(box, body, there ? markup : () => "");
  }

  updateAbove(above, compared, baseline) {
    while (this.above.children.length > above.length) this.above.lastChild.remove();
    above.forEach((link, n) => {
      let box = this.above.children[n];
      if (!box) {
        box = h("details", { class: "pk-fold", open: link.open }, h("summary"), h("div", { class: "pk-fold-body" }));
        this.above.append(box);
      }
      setText(box.firstChild, `${link.title} results`);
      fillFold(box, box.lastChild, () => tableMarkup(link.rows, compared && !link.plain, baseline));
    });
  }

  async copyCode() {
    const text = this.code.textContent;
    try {
      await navigator.clipboard.writeText(text);
      this.copied.textContent = "Copied.";
    } catch {
      const range = document.createRange();
      range.selectNodeContents(this.code);
      const selection = window.getSelection();
      selection.removeAllRanges();
      selection.addRange(range);
      this.copied.textContent = "Selected: copy it with the keyboard.";
    }
    setTimeout(() => (this.copied.textContent = ""), 4000);
  }

  // The static twin stands in the output before this one; it shows again as soon as no kernel is behind the panel.
  hideTwin(el) {
    const find = () => {
      const output = el.getRootNode().host?.closest?.(".jp-OutputArea-child") ?? el.closest(".jp-OutputArea-child, .output_area");
      const before = output?.previousElementSibling;
      return before?.querySelector(".pk-twin") ? before : null;
    };
    const set = (live) => {
      const twin = (this.twin ??= find());
      if (twin) twin.style.display = live ? "none" : "";
    };
    const alive = () => set(this.model.comm_live ?? true);
    setTimeout(alive, 0);
    this.model.on("comm_live_update", alive);
    this.showTwin = () => set(false);
  }

  // A class, not a container query: inside a query's container every question for a style costs a layout.
  watchWidth() {
    this.width = new ResizeObserver(() => this.root.classList.toggle("pk-narrow", this.root.clientWidth <= NARROW));
    this.width.observe(this.root);
  }

  stop() {
    this.width.disconnect();
    this.model.off("change:shown", this.draw);
    this.line.listeners.delete(this.listen);
    this.stopFigures();
    this.showTwin?.();
  }
}

export default {
  render({ model, el }) {
    const view = new PanelView(model, el);
    return () => view.stop();
  },
};
