"use strict";
// Reads the field of the solution at any point: u = A/r is a quadratic polynomial in every triangle.
(() => {
  const element = (id) => document.getElementById(id);
  const data = JSON.parse(element("field-data").textContent);
  const bytes = (text) => Uint8Array.from(atob(text), (sign) => sign.charCodeAt(0)).buffer;
  const doubles = (text) => new Float64Array(bytes(text));

  // ---- mesh, materials, fields -------------------------------------------------------------
  const vertices = doubles(data.vertices);
  const corners = new Uint32Array(bytes(data.corners));
  const nodes = new Uint32Array(bytes(data.nodes));
  const regionOf = new Uint16Array(bytes(data.region));
  const laws = data.laws.map((law) => ({ b: doubles(law.b), h: doubles(law.h), slope: doubles(law.slope) }));
  const fields = data.currents.map((entry) => doubles(entry.u));
  const outlines = data.outlines.map((entry) => ({ role: entry.role, ends: new Float32Array(bytes(entry.ends)) }));
  const count = regionOf.length;
  const sides = data.mirrored ? [1, -1] : [1];

  // Local coordinates of (r, z) in a triangle: x = a (r - r0) + b (z - z0), y = c (r - r0) + d (z - z0).
  const frame = new Float64Array(6 * count);
  const box = new Float64Array(4 * count);
  for (let e = 0; e < count; e += 1) {
    const [r0, r1, r2] = [0, 1, 2].map((k) => vertices[2 * corners[3 * e + k]]);
    const [z0, z1, z2] = [0, 1, 2].map((k) => vertices[2 * corners[3 * e + k] + 1]);
    const area = (r1 - r0) * (z2 - z0) - (r2 - r0) * (z1 - z0);
    frame.set([r0, z0, (z2 - z0) / area, (r0 - r2) / area, (z0 - z1) / area, (r1 - r0) / area], 6 * e);
    box.set([Math.min(r0, r1, r2), Math.max(r0, r1, r2), Math.min(z0, z1, z2), Math.max(z0, z1, z2)], 4 * e);
  }

  // Coefficients of 1, x, y, x^2, x y, y^2 of u in a triangle, from corners and middles of edges.
  const polynomial = (u, e) => {
    const [a, b, c, ab, bc, ca] = [0, 1, 2, 3, 4, 5].map((k) => u[nodes[6 * e + k]]);
    return [a, 4 * ab - 3 * a - b, 4 * ca - 3 * a - c, 2 * a + 2 * b - 4 * ab, 4 * (a - ab + bc - ca), 2 * a + 2 * c - 4 * ca];
  };

  const fieldIn = (u, e, r, z) => {
    const [r0, z0, a, b, c, d] = frame.subarray(6 * e, 6 * e + 6);
    const [x, y] = [a * (r - r0) + b * (z - z0), c * (r - r0) + d * (z - z0)];
    const p = polynomial(u, e);
    const value = p[0] + x * (p[1] + p[3] * x + p[4] * y) + y * (p[2] + p[5] * y);
    const [alongX, alongY] = [p[1] + 2 * p[3] * x + p[4] * y, p[2] + p[4] * x + 2 * p[5] * y];
    const [alongR, alongZ] = [alongX * a + alongY * c, alongX * b + alongY * d];
    return { br: -r * alongZ, bz: 2 * value + r * alongR, flux: 2 * Math.PI * r * r * value };
  };

  const triangleAt = (r, z) => {
    let [best, depth] = [-1, -1e-6];
    for (let e = 0; e < count; e += 1) {
      if (r < box[4 * e] || r > box[4 * e + 1] || z < box[4 * e + 2] || z > box[4 * e + 3]) continue;
      const [r0, z0, a, b, c, d] = frame.subarray(6 * e, 6 * e + 6);
      const [x, y] = [a * (r - r0) + b * (z - z0), c * (r - r0) + d * (z - z0)];
      const inside = Math.min(x, y, 1 - x - y);
      if (inside > depth) [best, depth] = [e, inside];
    }
    return best;
  };

  // H at |B| by the cubic with the values and slopes of the entries on either side.
  const strengthOf = (law, b) => {
    const last = law.b.length - 1;
    if (b >= law.b[last]) return law.h[last] + (b - law.b[last]) * law.slope[last];
    let [low, high] = [0, last];
    while (high - low > 1) {
      const middle = (low + high) >> 1;
      if (law.b[middle] <= b) low = middle; else high = middle;
    }
    const width = law.b[high] - law.b[low];
    const t = (b - law.b[low]) / width;
    return (1 + 2 * t) * (1 - t) ** 2 * law.h[low] + t * (1 - t) ** 2 * width * law.slope[low]
      + t ** 2 * (3 - 2 * t) * law.h[high] - t ** 2 * (1 - t) * width * law.slope[high];
  };

  const fieldAt = (index, r, z) => {
    const mirrored = data.mirrored && z < 0;
    const e = triangleAt(r, mirrored ? -z : z);
    if (e < 0) return null;
    const { br, bz, flux } = fieldIn(fields[index], e, r, mirrored ? -z : z);
    const region = data.regions[regionOf[e]];
    const strength = strengthOf(laws[region.law], Math.hypot(br, bz - region.remanence));
    return {
      name: mirrored ? region.below : region.name, br: mirrored ? -br : br, bz, b: Math.hypot(br, bz), strength, flux,
    };
  };

  // ---- state -------------------------------------------------------------------------------
  const canvas = element("map");
  const context = canvas.getContext("2d");
  const view = { r: 0, z: 0, height: 1 };
  let current = data.start;
  let kept = null;
  let picture = null;
  const whole = data.views.section;
  const largestFlux = fields.map((u) => {
    let largest = 0;
    for (let e = 0; e < count; e += 1) {
      for (let k = 0; k < 3; k += 1) {
        const r = vertices[2 * corners[3 * e + k]];
        largest = Math.max(largest, Math.abs(2 * Math.PI * r * r * u[nodes[6 * e + k]]));
      }
    }
    return largest;
  });
  const LINES = 20;
  const scaleOf = () => view.height / canvas.height; // metres to a pixel
  const toPixel = (r, z) => [(r - view.r) / scaleOf() + canvas.width / 2, (view.z - z) / scaleOf() + canvas.height / 2];
  const toPlace = (x, y) => [view.r + (x - canvas.width / 2) * scaleOf(), view.z - (y - canvas.height / 2) * scaleOf()];
  const pixelRatio = () => Math.min(window.devicePixelRatio || 1, 2);

  const show = ([r0, r1, z0, z1]) => {
    view.r = (r0 + r1) / 2;
    view.z = (z0 + z1) / 2;
    view.height = Math.max(z1 - z0, (r1 - r0) * canvas.height / canvas.width);
    draw();
  };

  const limit = () => {
    const largest = Math.max(whole[3] - whole[2], (whole[1] - whole[0]) * canvas.height / canvas.width);
    view.height = Math.min(Math.max(view.height, 1e-4 * largest), largest);
    const [across, up] = [view.height * canvas.width / canvas.height / 2, view.height / 2];
    const kept = (value, low, high, half) => (high - low <= 2 * half ? (low + high) / 2 : Math.min(Math.max(value, low + half), high - half));
    view.r = kept(view.r, whole[0], whole[1], across);
    view.z = kept(view.z, whole[2], whole[3], up);
  };

  // ---- drawing -----------------------------------------------------------------------------
  // Between two lines flows a share of the flux that halves each time the view does.
  const fluxStep = () => {
    const zoom = Math.max(1, (whole[3] - whole[2]) / view.height);
    return 2 * largestFlux[current] / LINES / 2 ** Math.floor(Math.log2(zoom) * 0.75);
  };

  const paintTriangle = (e, side, image, step) => {
    const { width, height } = canvas;
    const scale = scaleOf();
    const [low, high] = side > 0 ? [box[4 * e + 2], box[4 * e + 3]] : [-box[4 * e + 3], -box[4 * e + 2]];
    const [left, top] = toPixel(box[4 * e], high);
    const [right, bottom] = toPixel(box[4 * e + 1], low);
    const [x0, x1] = [Math.max(0, Math.floor(left)), Math.min(width - 1, Math.ceil(right))];
    const [y0, y1] = [Math.max(0, Math.floor(top)), Math.min(height - 1, Math.ceil(bottom))];
    if (x0 > x1 || y0 > y1) return;
    const [r0, z0, a, b, c, d] = frame.subarray(6 * e, 6 * e + 6);
    const p = polynomial(fields[current], e);
    const pixels = image.data;
    for (let j = y0; j <= y1; j += 1) {
      const z = side * (view.z - (j + 0.5 - height / 2) * scale);
      for (let i = x0; i <= x1; i += 1) {
        const r = view.r + (i + 0.5 - width / 2) * scale;
        const x = a * (r - r0) + b * (z - z0);
        const y = c * (r - r0) + d * (z - z0);
        if (x < -1e-7 || y < -1e-7 || x + y > 1 + 1e-7) continue;
        const u = p[0] + x * (p[1] + p[3] * x + p[4] * y) + y * (p[2] + p[5] * y);
        const alongX = p[1] + 2 * p[3] * x + p[4] * y;
        const alongY = p[2] + p[4] * x + 2 * p[5] * y;
        const br = -r * (alongX * b + alongY * d);
        const bz = 2 * u + r * (alongX * a + alongY * c);
        const size = Math.hypot(br, bz);
        const colour = data.colours[Math.min(255, Math.floor(256 * size / data.scale))];
        const level = 2 * Math.PI * r * r * u / step - 0.5;
        const away = Math.abs(level - Math.round(level)) * step / (2 * Math.PI * r * size * scale + 1e-300);
        const ink = 0.85 * Math.min(1, Math.max(0, 0.5 * pixelRatio() + 0.5 - away));
        const at = 4 * (j * width + i);
        for (let k = 0; k < 3; k += 1) pixels[at + k] = colour[k] * (1 - ink) + 20 * ink;
        pixels[at + 3] = 255;
      }
    }
  };

  const paint = () => {
    picture = context.createImageData(canvas.width, canvas.height);
    picture.data.fill(255);
    const step = fluxStep();
    for (const side of sides) for (let e = 0; e < count; e += 1) paintTriangle(e, side, picture, step);
    element("between-lines").textContent = `Between two flux lines flows ${withPrefix(step, "Wb")}.`;
  };

  const drawOutlines = () => {
    for (const { role, ends } of outlines) {
      context.lineWidth = pixelRatio() * (role === "core" ? 1.8 : 1.2);
      context.setLineDash(role === "core" ? [] : [5 * pixelRatio(), 3 * pixelRatio()]);
      context.beginPath();
      for (let k = 0; k < ends.length; k += 4) {
        context.moveTo(...toPixel(ends[k], ends[k + 1]));
        context.lineTo(...toPixel(ends[k + 2], ends[k + 3]));
      }
      context.stroke();
    }
    context.setLineDash([]);
  };

  const drawNames = () => {
    context.font = `${12 * pixelRatio()}px sans-serif`;
    context.textAlign = "center";
    context.textBaseline = "middle";
    for (const { text, r, z } of data.labels) {
      const [x, y] = toPixel(r, z);
      context.save();
      context.translate(x, y);
      context.rotate(-Math.PI / 2);
      context.lineWidth = 4 * pixelRatio();
      context.strokeStyle = "white";
      context.strokeText(text, 0, 0);
      context.fillText(text, 0, 0);
      context.restore();
    }
  };

  const drawRuler = () => {
    const ratio = pixelRatio();
    const most = 0.3 * canvas.width * scaleOf();
    const power = 10 ** Math.floor(Math.log10(most));
    const length = power * [5, 2, 1].find((step) => step * power <= most);
    const [x, y, wide] = [12 * ratio, canvas.height - 12 * ratio, length / scaleOf()];
    context.fillStyle = "rgba(255, 255, 255, 0.85)";
    context.fillRect(x - 6 * ratio, y - 22 * ratio, wide + 12 * ratio, 30 * ratio);
    context.fillStyle = "black";
    context.fillRect(x, y, wide, 2 * ratio);
    context.font = `${11 * ratio}px sans-serif`;
    context.textAlign = "left";
    context.textBaseline = "bottom";
    context.fillText(withPrefix(length, "m", 1), x, y - 3 * ratio);
  };

  const drawPlace = ([r, z]) => {
    const [x, y] = toPixel(r, z);
    const size = 9 * pixelRatio();
    for (const [colour, width] of [["white", 4], ["black", 1.6]]) {
      context.strokeStyle = colour;
      context.lineWidth = width * pixelRatio();
      context.beginPath();
      context.arc(x, y, size / 2, 0, 2 * Math.PI);
      for (const [dx, dy] of [[1, 0], [-1, 0], [0, 1], [0, -1]]) {
        context.moveTo(x + dx * size / 2, y + dy * size / 2);
        context.lineTo(x + dx * 1.6 * size, y + dy * 1.6 * size);
      }
      context.stroke();
    }
    context.strokeStyle = "black";
  };

  const overlay = (place) => {
    context.putImageData(picture, 0, 0);
    context.strokeStyle = "black";
    context.fillStyle = "black";
    drawOutlines();
    drawNames();
    drawRuler();
    if (place) drawPlace(place);
    read(place);
  };

  let waiting = false;
  const draw = () => {
    if (waiting) return;
    waiting = true;
    requestAnimationFrame(() => {
      waiting = false;
      limit();
      paint();
      overlay(kept);
    });
  };

  // ---- reading -----------------------------------------------------------------------------
  const PREFIXES = [[1e6, "M"], [1e3, "k"], [1, ""], [1e-3, "m"], [1e-6, "\u00b5"], [1e-9, "n"], [1e-12, "p"]];
  const withPrefix = (value, unit, digits = 5) => {
    if (value === 0) return `0 ${unit}`;
    const size = Math.abs(Number(value.toPrecision(digits)));
    const [factor, prefix] = PREFIXES.find(([least]) => size >= least * (1 - 1e-12)) || PREFIXES[PREFIXES.length - 1];
    const scaled = value / factor;
    const decimals = Math.max(0, digits - 1 - Math.floor(Math.log10(Math.abs(Number(scaled.toPrecision(digits)))) + 1e-12));
    return `${scaled.toFixed(Math.min(decimals, 12)).replace("-", "\u2212")} ${prefix}${unit}`;
  };

  const fill = (table, rows) => {
    const body = table.tBodies[0];
    body.replaceChildren(...rows.map(([name, text, value]) => {
      const row = document.createElement("tr");
      const head = document.createElement("th");
      head.scope = "row";
      head.textContent = name;
      const cell = document.createElement("td");
      cell.textContent = text;
      if (value !== undefined) cell.title = `${value}`;
      row.append(head, cell);
      return row;
    }));
  };

  const millimetres = (value) => `${(1e3 * value).toFixed(4).replace("-", "\u2212")} mm`;
  let speaking = 0;
  const read = (place) => {
    const found = place && fieldAt(current, ...place);
    if (!found) {
      fill(element("reading"), [["place", "none"]]);
      return;
    }
    fill(element("reading"), [
      ["place", found.name],
      ["radius r", millimetres(place[0]), place[0]],
      ["height z", millimetres(place[1]), place[1]],
      ["|B|", withPrefix(found.b, "T"), found.b],
      ["radial B", withPrefix(found.br, "T"), found.br],
      ["axial B", withPrefix(found.bz, "T"), found.bz],
      ["H", withPrefix(found.strength, "A/m"), found.strength],
      ["flux inside r", withPrefix(found.flux, "Wb"), found.flux],
    ]);
    clearTimeout(speaking);
    speaking = setTimeout(() => {
      element("spoken").textContent = `${found.name}: B ${withPrefix(found.b, "T", 3)}, H ${withPrefix(found.strength, "A/m", 3)}`;
    }, 400);
  };

  const setCurrent = (index) => {
    current = Math.min(Math.max(index, 0), fields.length - 1);
    const entry = data.currents[current];
    element("current").value = `${current}`;
    element("current").setAttribute("aria-valuetext", withPrefix(entry.current, "A", 4));
    element("current-value").textContent = withPrefix(entry.current, "A", 4);
    element("step-down").disabled = current === 0;
    element("step-up").disabled = current === fields.length - 1;
    fill(element("at-current"), entry.values);
    draw();
  };

  // ---- hands -------------------------------------------------------------------------------
  const zoom = (factor, [r, z]) => {
    view.height /= factor;
    view.r = r + (view.r - r) / factor;
    view.z = z + (view.z - z) / factor;
    draw();
  };
  const placeOf = (event) => {
    const area = canvas.getBoundingClientRect();
    const x = (event.clientX - area.left - canvas.clientLeft) * canvas.width / canvas.clientWidth;
    const y = (event.clientY - area.top - canvas.clientTop) * canvas.height / canvas.clientHeight;
    return toPlace(x, y);
  };
  const inView = ([r, z]) => [Math.min(Math.max(r, whole[0]), whole[1]), Math.min(Math.max(z, whole[2]), whole[3])];

  let drag = null;
  canvas.addEventListener("pointerdown", (event) => {
    canvas.setPointerCapture(event.pointerId);
    drag = { from: placeOf(event), x: event.clientX, y: event.clientY, moved: false };
  });
  canvas.addEventListener("pointermove", (event) => {
    if (!drag) {
      overlay(inView(placeOf(event)));
      return;
    }
    drag.moved = drag.moved || Math.hypot(event.clientX - drag.x, event.clientY - drag.y) > 4;
    if (drag.moved) {
      const [r, z] = placeOf(event);
      view.r += drag.from[0] - r;
      view.z += drag.from[1] - z;
      limit();
      draw();
    }
  });
  canvas.addEventListener("pointerup", (event) => {
    if (drag && !drag.moved) {
      kept = inView(placeOf(event));
      overlay(kept);
    }
    drag = null;
  });
  canvas.addEventListener("pointercancel", () => { drag = null; });
  canvas.addEventListener("pointerleave", () => { if (!drag && picture) overlay(kept); });
  canvas.addEventListener("wheel", (event) => {
    if (document.activeElement !== canvas && !event.ctrlKey) return;
    event.preventDefault();
    zoom(2 ** (-Math.sign(event.deltaY) * 0.35), placeOf(event));
  }, { passive: false });

  const move = (dr, dz) => {
    const place = inView([kept[0] + dr, kept[1] + dz]);
    kept = place;
    const [x, y] = toPixel(...place);
    if (x < 0 || y < 0 || x > canvas.width || y > canvas.height) {
      [view.r, view.z] = place;
      draw();
    } else {
      overlay(place);
    }
  };
  canvas.addEventListener("keydown", (event) => {
    if (event.ctrlKey || event.metaKey || event.altKey) return;
    const step = view.height / (event.shiftKey ? 400 : 40);
    const actions = {
      ArrowLeft: () => move(-step, 0), ArrowRight: () => move(step, 0),
      ArrowUp: () => move(0, step), ArrowDown: () => move(0, -step),
      "+": () => zoom(1.5, kept), "=": () => zoom(1.5, kept), "-": () => zoom(1 / 1.5, kept),
      PageUp: () => setCurrent(current + 1), PageDown: () => setCurrent(current - 1),
      Home: () => show(whole), g: () => show(data.views.gap), G: () => show(data.views.gap),
    };
    if (!(event.key in actions)) return;
    event.preventDefault();
    actions[event.key]();
  });
  element("view-section").addEventListener("click", () => show(whole));
  element("view-gap").addEventListener("click", () => show(data.views.gap));
  element("zoom-in").addEventListener("click", () => zoom(1.5, kept));
  element("zoom-out").addEventListener("click", () => zoom(1 / 1.5, kept));
  element("current").addEventListener("input", (event) => setCurrent(Number(event.target.value)));
  element("step-down").addEventListener("click", () => setCurrent(current - 1));
  element("step-up").addEventListener("click", () => setCurrent(current + 1));

  // ---- start -------------------------------------------------------------------------------
  const drawScale = () => {
    const bar = element("scale").getContext("2d");
    data.colours.forEach((colour, k) => {
      bar.fillStyle = `rgb(${colour.join(",")})`;
      bar.fillRect(k, 0, 1, 14);
    });
    element("scale-end").textContent = `${data.scale.toFixed(3)} and above`;
  };
  const fit = () => {
    const [width, height] = [canvas.clientWidth, canvas.clientHeight].map((size) => Math.round(size * pixelRatio()));
    if (!width || !height || (width === canvas.width && height === canvas.height)) return;
    [canvas.width, canvas.height] = [width, height];
    draw();
  };
  canvas.style.aspectRatio = `${whole[1] - whole[0]} / ${whole[3] - whole[2]}`;
  element("viewer").hidden = false;
  element("current").max = `${fields.length - 1}`;
  const gap = data.views.gap;
  kept = [(gap[0] + gap[1]) / 2, (gap[2] + gap[3]) / 2];
  drawScale();
  fit();
  show(whole);
  setCurrent(data.start);
  new ResizeObserver(fit).observe(canvas);
})();
