// Saving and loading without a server's file route: the text goes to the browser and comes from it.
function render({ model, el }) {
  const stop = new AbortController();
  const on = (target, kind, run) => target.addEventListener(kind, run, { signal: stop.signal });
  const button = (text, hint) => {
    const made = document.createElement("button");
    made.type = "button";
    made.className = "x-button";
    made.textContent = text;
    made.title = hint;
    el.append(made);
    return made;
  };
  const save = button("Save design", "Save this design point as JSON");
  const load = button("Load design", "Load a design point from JSON");
  const pick = document.createElement("input");
  pick.type = "file";
  pick.accept = ".json,application/json";
  pick.hidden = true;
  pick.className = "x-pick";
  pick.setAttribute("aria-label", "Design file");
  el.append(pick);
  on(save, "click", () => model.send({ kind: "save" }));
  on(load, "click", () => pick.click());
  on(pick, "change", async () => {
    const file = pick.files[0];
    if (!file) return;
    const most = model.get("largest");
    if (file.size > most) {
      model.send({ kind: "too large", name: file.name.slice(0, 200), size: file.size });
    } else {
      model.send({ kind: "load", name: file.name.slice(0, 200) }, {}, [await file.arrayBuffer()]);
    }
    pick.value = "";
  });
  const hear = (message, buffers) => {
    if (message.kind !== "file") return;
    const address = URL.createObjectURL(new Blob([buffers[0]], { type: "application/json" }));
    const link = document.createElement("a");
    link.href = address;
    link.download = message.name;
    link.click();
    setTimeout(() => URL.revokeObjectURL(address), 10000);
  };
  model.on("msg:custom", hear);
  return () => {
    stop.abort();
    model.off("msg:custom", hear);
  };
}

export default { render };
