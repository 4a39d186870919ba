export default {
  render({ model, el }) {
    const box = document.createElement("div");
    box.className = "pk-root pk-figures";
    el.append(box);
    return hostFigures(model, box);
  },
};
