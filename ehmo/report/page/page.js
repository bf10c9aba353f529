"use strict";
(() => {
  const body = document.body;
  const find = (id) => document.getElementById(id);
  // A page of a crystal has no view, and then no data for one.
  const data = find("page-data") ? JSON.parse(find("page-data").textContent) : null;
  const all = (selector, within = document) => Array.from(within.querySelectorAll(selector));
  const view = find("view"), still = find("view-still"), shownText = find("shown"), level = find("level");
  const dark = window.matchMedia("(prefers-color-scheme: dark)");
  const state = { channel: null, orbital: null, part: "both", level: data ? data.level : 0, labels: true, bond: null };
  const camera = { eye: data ? [...data.eye] : [1, 0, 0], up: [0, 0, 1], centre: [0, 0, 0], distance: 1, zoom: 1 };
  const decoded = new Map();
  let drawing = false;

  const inflated = async (text) => {
    const bytes = Uint8Array.from(atob(text), (char) => char.charCodeAt(0));
    const stream = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("deflate"));
    return new Uint8Array(await new Response(stream).arrayBuffer());
  };

  // The inverse of `packed` in surfaces.py.
  const unpacked = (bytes) => {
    const counts = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength), found = [];
    let at = 0;
    const numbers = (count) => {
      const out = new Int32Array(count);
      for (let k = 0; k < count; k++) {
        const raw = bytes[at + k] + 256 * bytes[at + count + k];
        out[k] = (raw >>> 1) ^ -(raw & 1);
      }
      at += 2 * count;
      return out;
    };
    while (at < bytes.length) {
      const n = counts.getUint32(at, true), m = counts.getUint32(at + 4, true);
      at += 8;
      if (!n) { found.push(null); continue; }
      const steps = numbers(3 * n), back = numbers(3 * m), axes = [];
      for (let axis = 0; axis < 3; axis++) {
        const values = new Float32Array(n);
        let sum = 0;
        for (let k = 0; k < n; k++) { sum += steps[axis * n + k]; values[k] = sum * data.step; }
        axes.push(values);
      }
      const corners = [new Int32Array(m), new Int32Array(m), new Int32Array(m)];
      let highest = -1;
      for (let k = 0; k < 3 * m; k++) {
        const corner = highest + 1 - back[k];
        corners[k % 3][(k - (k % 3)) / 3] = corner;
        if (corner > highest) highest = corner;
      }
      found.push({ x: axes[0], y: axes[1], z: axes[2], i: corners[0], j: corners[1], k: corners[2] });
    }
    return found;
  };

  const surfacesOf = async (key) => {
    if (!decoded.has(key)) {
      const text = key === "molecule" ? data.molecule : data.surfaces[key];
      decoded.set(key, unpacked(await inflated(text)));
    }
    return decoded.get(key);
  };

  const variable = (name) => getComputedStyle(document.documentElement).getPropertyValue(name).trim();

  const mesh = (surface, colour, opacity, glossy) => ({
    type: "mesh3d", ...surface, color: colour, opacity, hoverinfo: "skip", flatshading: false,
    lighting: { ambient: 0.58, diffuse: 0.62, specular: glossy ? 0.35 : 0.1, roughness: 0.35, fresnel: 0.1 },
    lightposition: { x: 4e4, y: 6e4, z: 1e5 },
  });

  const traces = async () => {
    const phases = dark.matches ? data.darkPhases : data.phases;
    const out = [];
    (await surfacesOf("molecule")).forEach((one, k) => { if (one) out.push(mesh(one, data.colours[k], 1, false)); });
    const key = state.orbital === null ? state.channel : `orbital-${state.orbital}`;
    const own = await surfacesOf(key), per = 2 * data.levels.length;
    const add = (start, opacity) => {
      for (let sign = 0; sign < 2; sign++) {
        const one = own[start + 2 * state.level + sign];
        if (one) out.push(mesh(one, phases[sign], opacity, true));
      }
    };
    if (state.orbital !== null) add(0, 0.8);
    else {
      if (state.part !== "donor") add(0, state.part === "both" ? 0.9 : 0.8);
      if (state.part !== "metal") add(per, state.part === "both" ? 0.55 : 0.8);
    }
    return out;
  };

  const plotCamera = () => {
    const c = camera.centre.map((value) => value / (2 * data.reach)), d = camera.distance / camera.zoom;
    const point = (v) => ({ x: v[0], y: v[1], z: v[2] });
    return { eye: point(camera.eye.map((value, k) => c[k] + d * value)), up: point(camera.up), center: point(c) };
  };

  const layout = () => {
    const axis = { visible: false, showspikes: false, autorange: false, range: [-data.reach, data.reach] };
    const ink = variable("--ink"), paper = variable("--paper");
    const annotations = !state.labels ? [] : data.atoms.map((atom) => ({
      x: atom.place[0], y: atom.place[1], z: atom.place[2], text: atom.label, showarrow: false,
      font: { size: 13, color: ink, family: variable("--fonts") }, bgcolor: paper, opacity: 0.82, borderpad: 1,
    }));
    return {
      scene: {
        xaxis: axis, yaxis: { ...axis }, zaxis: { ...axis }, aspectmode: "cube", dragmode: "orbit",
        camera: plotCamera(), annotations, bgcolor: "rgba(0,0,0,0)",
      },
      paper_bgcolor: "rgba(0,0,0,0)", margin: { l: 0, r: 0, t: 0, b: 0 }, showlegend: false, hovermode: false,
    };
  };

  const words = () => {
    if (state.orbital !== null) {
      const button = document.querySelector(`[data-orbital="${state.orbital}"][aria-label]`);
      return (button ? button.getAttribute("aria-label") : `Orbital ${state.orbital + 1}`).replace(/^Show o/, "O");
    }
    const parts = { both: "metal and donor hybrid", metal: "metal hybrid", donor: "donor hybrid" };
    return `${find(state.channel).closest(".channel").dataset.name}: ${parts[state.part]}`;
  };

  const draw = async () => {
    const said = words();
    const picture = state.orbital === null
      ? document.querySelector(`[data-key="${state.channel}"] .still img`)
      : find(`still-orbital-${state.orbital}`);
    shownText.textContent = said;
    find("echo-words").textContent = said;
    find("echo").src = picture.src;
    find("echo").alt = picture.alt;
    find("level-value").textContent = data.levels[state.level].toFixed(2);
    if (body.classList.contains("still-only")) {
      still.src = picture.src;
      still.alt = picture.alt;
      return;
    }
    if (!window.Plotly) return;
    view.setAttribute("aria-label", `Molecule in three dimensions. ${said}, surface at ${data.levels[state.level]}.`);
    drawing = true;
    await window.Plotly.react(view, await traces(), layout(), { displayModeBar: false, responsive: true, scrollZoom: false });
    drawing = false;
    view.dataset.drawn = String(1 + Number(view.dataset.drawn || 0));
  };

  const look = () => {
    const whole = state.orbital !== null;
    const own = data.places[state.channel];
    camera.centre = whole ? [0, 0, 0] : own.centre;
    camera.distance = 1.27 * (whole ? 0.8 : Math.min(0.8, own.half / data.reach));
    camera.zoom = 1;
    if (own.bond !== state.bond) {
      camera.eye = [...own.eye];
      camera.up = [0, 0, 1];
      state.bond = own.bond;
    }
  };

  const mark = () => {
    const channel = find(state.channel).closest(".channel");
    const carrying = new Set(all(".orbital", channel).map((button) => button.dataset.orbital));
    find("carriers-here").replaceChildren(...Array.from(channel.querySelector(".carriers").children, (one) => one.cloneNode(true)));
    all(".level").forEach((one) => one.classList.toggle("carries", carrying.has(one.dataset.orbital)));
    all("[data-orbital]").forEach((one) => {
      const chosen = Number(one.dataset.orbital) === state.orbital;
      one.setAttribute("aria-pressed", String(chosen));
      if (one.parentElement.classList.contains("plate")) one.parentElement.classList.toggle("chosen", chosen);
    });
    all("[data-show]").forEach((one) => {
      const chosen = state.orbital === null && one.dataset.show === state.part;
      one.setAttribute("aria-pressed", String(chosen));
    });
  };

  const choose = (change) => {
    // What is shown stays shown while its button is replaced by a copy: keep the focus on the copy.
    const held = document.activeElement && document.activeElement.closest("#carriers-here .orbital");
    Object.assign(state, change);
    look();
    mark();
    if (held) {
      const again = document.querySelector(`#carriers-here [data-orbital="${held.dataset.orbital}"]`);
      if (again) again.focus({ preventScroll: true });
    }
    return draw();
  };

  const chooseOrbital = (orbital) => choose({ orbital: state.orbital === orbital ? null : orbital });

  const turned = (vector, axis, angle) => {
    const [x, y, z] = axis, c = Math.cos(angle), s = Math.sin(angle);
    const dot = vector[0] * x + vector[1] * y + vector[2] * z;
    const cross = [y * vector[2] - z * vector[1], z * vector[0] - x * vector[2], x * vector[1] - y * vector[0]];
    return vector.map((value, k) => value * c + cross[k] * s + axis[k] * dot * (1 - c));
  };
  const unit = (vector) => { const n = Math.hypot(...vector); return vector.map((value) => value / n); };
  const across = (a, b) => [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]];

  const turn = (key) => {
    const angle = Math.PI / 18, right = unit(across(camera.up, camera.eye));
    const upright = unit(across(camera.eye, right));
    const moves = {
      ArrowLeft: [upright, -angle], ArrowRight: [upright, angle], ArrowUp: [right, -angle], ArrowDown: [right, angle],
    };
    if (moves[key]) {
      const [axis, by] = moves[key];
      camera.eye = unit(turned(camera.eye, axis, by));
      camera.up = unit(turned(upright, axis, by));
    } else if (key === "+" || key === "=") camera.zoom *= 1.15;
    else if (key === "-") camera.zoom /= 1.15;
    else if (key === "Home" || key === "0") { state.bond = null; look(); }
    else return false;
    if (window.Plotly && !body.classList.contains("still-only")) {
      window.Plotly.relayout(view, { "scene.camera": plotCamera() }).then(() => {
        view.dataset.drawn = String(1 + Number(view.dataset.drawn || 0));
      });
    }
    return true;
  };

  const turnedByHand = (change) => {
    const seen = change["scene.camera"];
    if (!seen || drawing) return;
    const list = (point) => [point.x, point.y, point.z];
    const eye = list(seen.eye), centre = list(seen.center);
    const away = eye.map((value, k) => value - centre[k]);
    camera.eye = unit(away);
    camera.up = unit(list(seen.up));
    camera.centre = centre.map((value) => value * 2 * data.reach);
    camera.zoom = camera.distance / Math.hypot(...away);
  };

  const hasWebGL = () => {
    try {
      const canvas = document.createElement("canvas");
      return Boolean(canvas.getContext("webgl2") || canvas.getContext("webgl"));
    } catch { return false; }
  };

  const stills = (why) => {
    body.classList.add("still-only");
    find("why-still").textContent = why;
    return draw();
  };

  const start = async () => {
    if (!hasWebGL()) return stills("Still pictures: this browser offers no WebGL.");
    try {
      const library = document.createElement("script");
      library.textContent = new TextDecoder().decode(await inflated(find("page-library").textContent));
      document.head.append(library);
      if (!window.Plotly) throw new Error("the library did not start");
      await draw();
      view.on("plotly_relayout", turnedByHand);
    } catch (fault) {
      return stills("Still pictures: the view in three dimensions did not start in this browser.");
    }
  };

  const save = async (name) => {
    const bytes = await inflated(data.files[name]);
    const link = document.createElement("a");
    link.href = URL.createObjectURL(new Blob([bytes], { type: "chemical/x-cube" }));
    link.download = name;
    link.click();
    setTimeout(() => URL.revokeObjectURL(link.href), 10000);
  };

  const copied = async () => {
    const text = find("method-text"), range = document.createRange();
    range.selectNodeContents(text);
    const selection = window.getSelection();
    selection.removeAllRanges();
    selection.addRange(range);
    try {
      await navigator.clipboard.writeText(JSON.parse(find("method-plain").textContent));
      find("copied").textContent = " Copied.";
    } catch {
      find("copied").textContent = " Selected: copy it with the keyboard.";
    }
  };

  // On paper nothing can be unfolded.
  window.addEventListener("beforeprint", () => all("details:not([open])").forEach((one) => { one.open = true; one.dataset.folded = ""; }));
  window.addEventListener("afterprint", () => all("details[data-folded]").forEach((one) => { one.open = false; delete one.dataset.folded; }));

  const wireView = () => {
    all(".channel-radio").forEach((radio) => radio.addEventListener("change", () => choose({ channel: radio.value, orbital: null })));
    document.addEventListener("click", (event) => {
      const target = event.target.closest("[data-orbital], [data-show], [data-file]");
      if (!target) return;
      if (target.dataset.file) save(target.dataset.file);
      else if (target.dataset.show) choose({ part: target.dataset.show, orbital: null });
      else {
        chooseOrbital(Number(target.dataset.orbital));
        // From the plates the view is out of sight.
        if (target.closest(".plate")) find("viewer").scrollIntoView({ block: "start" });
      }
    });
    document.addEventListener("keydown", (event) => {
      const chosen = event.target.closest && event.target.closest(".level");
      if (chosen && (event.key === "Enter" || event.key === " ")) {
        event.preventDefault();
        chooseOrbital(Number(chosen.dataset.orbital));
      }
    });
    view.addEventListener("keydown", (event) => {
      if (!event.ctrlKey && !event.metaKey && !event.altKey && turn(event.key)) event.preventDefault();
    });
    level.addEventListener("input", () => { state.level = Number(level.value); draw(); });
    find("labels").addEventListener("change", (event) => { state.labels = event.target.checked; draw(); });
    find("reset").addEventListener("click", () => turn("Home"));
    dark.addEventListener("change", draw);
    const chosen = document.querySelector(".channel-radio:checked");
    if (chosen) {
      state.channel = chosen.value;
      look();
      mark();
      start();
    }
  };

  body.classList.add("scripted");
  find("copy-method").addEventListener("click", copied);
  if (view) wireView();
})();
