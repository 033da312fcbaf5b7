// The calculator of the page: ideal formula times interpolated factor, with its standard uncertainty. SI inside.
"use strict";
(() => {
  const T = JSON.parse(document.getElementById("table-data").textContent);
  const PANELS = 12;
  const GAUSS = [
    [0.1834346424956498, 0.362683783378362],
    [0.525532409916329, 0.3137066458778873],
    [0.7966664774136267, 0.2223810344533745],
    [0.9602898564975363, 0.1012285362903763],
  ];

  // A coordinate in which the factors are smooth: value and slope.
  function graded(g, v) {
    const s = Math.sin(v), c = Math.cos(v);
    if (g.kind === "above") return [Math.log(v - g.drop), 1 / (v - g.drop)];
    if (g.kind === "wedge") {
      const e = g.steepness * s;
      return [Math.atanh(e), g.steepness * c / (1 - e * e)];
    }
    const edges = g.reach.map((reach) => {
      const h = g.base + reach * s - g.height * c;
      return [Math.log(h), (reach * c + g.height * s) / h];
    });
    return edges.length === 1 ? edges[0] : [edges[0][0] - edges[1][0], edges[0][1] - edges[1][1]];
  }

  function reduced(axis, v) {
    const [value, slope] = graded(axis.grading, v);
    const [a, b] = axis.ends;
    return [((value - a) - (b - value)) / (b - a), 2 * slope / (b - a)];
  }

  // The polynomials that are 1 at one node and 0 at the others: values and slopes.
  function basis(nodes, x) {
    return nodes.map((own, j) => {
      let value = 1, slope = 0;
      nodes.forEach((node, k) => {
        if (k === j) return;
        const per = 1 / (own - node);
        slope = (slope * (x - node) + value) * per;
        value *= (x - node) * per;
      });
      return [value, slope];
    });
  }

  function weights(at) {
    const bases = T.axes.map((axis, k) => basis(axis.nodes, reduced(axis, at[k])[0]));
    const product = (along) => bases.reduce(
      (all, basis, k) => all.flatMap((a) => basis.map((b) => a * b[k === along ? 1 : 0])), [1]);
    return { values: product(-1), slopes: bases.map((_, k) => product(k)) };
  }

  function interpolated(w, quantity) {
    const sum = (weights) => weights.reduce((s, v, n) => s + v * quantity.excess[n], 0);
    let common = 0, all = 0;
    w.values.forEach((v, n) => {
      common += Math.abs(v) * quantity.numerical[n];
      all += Math.abs(v);
    });
    return { value: sum(w.values), uncertainty: common / all, slopes: w.slopes.map(sum) };
  }

  function poseAt(at) {
    const pose = { ...T.pose, shift: T.shift };
    if (!T.along_hinge) {
      T.axes.forEach((axis, k) => { pose[axis.name] = at[k]; });
      return pose;
    }
    // The hinge stays, the plate's centre goes round it.
    const { arm, height } = T.hinge, angle = at[0];
    const s = Math.sin(angle), c = Math.cos(angle);
    const sideways = -arm - (-arm * c - height * s);
    return {
      gap: T.pose.gap + height - (-arm * s + height * c),
      tilt: angle,
      roll: T.pose.roll,
      shift: [T.shift[0] + sideways, T.shift[1]],
    };
  }

  function overlap(pose) {
    const span = (k) => [
      Math.max(-T.lower[k] / 2, pose.shift[k] - T.upper[k] / 2),
      Math.min(T.lower[k] / 2, pose.shift[k] + T.upper[k] / 2),
    ];
    const x = span(0), y = T.cross_section ? [-0.5, 0.5] : span(1);
    return { x, y, area: Math.max(0, x[1] - x[0]) * Math.max(0, y[1] - y[0]) };
  }

  // With a film the formulas take the gap of air that is worth as much.
  function effectiveGap(pose) {
    return T.film ? pose.gap - T.film.thickness + T.film.thickness / T.film.ratio : pose.gap;
  }

  // The ideal formulas at 1 V: capacitance, force, torque.
  function ideal(pose) {
    const gap = effectiveGap(pose);
    const capacitance = T.permittivity * overlap(pose).area / gap;
    const force = capacitance / (2 * gap);
    return [capacitance, force, T.hinge ? force * T.hinge.arm : 0];
  }

  function meanReciprocal(e) {
    if (Math.abs(e) >= 0.05) return Math.atanh(e) / e;
    let sum = 0;
    for (let k = 6; k >= 0; k--) sum += Math.pow(e, 2 * k) / (2 * k + 1);
    return sum;
  }

  function meanLever(e) {
    if (Math.abs(e) >= 0.05) return (meanReciprocal(e) - 1 / (1 - e * e)) / e;
    let sum = 0;
    for (let k = 7; k >= 1; k--) sum += Math.pow(e, 2 * k - 1) * (2 * k) / (2 * k + 1);
    return -sum;
  }

  // Integrals of 1/h, 1/h^2 and x/h^2 along x over a strip of unit width.
  function strip(x, middle, slope) {
    const length = x[1] - x[0], centre = 0.5 * (x[0] + x[1]);
    const e = 0.5 * length * slope / middle;
    const square = length / (middle * middle * (1 - e * e));
    const lever = 0.5 * length * length / (middle * middle) * meanLever(e);
    return [length / middle * meanReciprocal(e), square, centre * square + lever];
  }

  // What the tilt alone does, over the rectangle of the bench's own pose.
  function lamella(at) {
    const pose = { ...poseAt(at), shift: T.shift };
    const { x: bx, y: by, area } = overlap(pose);
    const x = bx.map((v) => v - pose.shift[0]), y = by.map((v) => v - pose.shift[1]);
    const d = effectiveGap(pose);
    const sx = Math.tan(pose.tilt) / Math.cos(pose.roll), sy = Math.tan(pose.roll);
    const along = (y) => strip(x, d + sx * 0.5 * (x[0] + x[1]) + sy * y, sx);
    let sum = [0, 0, 0];
    if (sy === 0) {
      sum = along(0).map((v) => v * (y[1] - y[0]));
    } else {
      const [narrow, wide] = sy > 0 ? y : [y[1], y[0]];
      let edge = narrow;
      for (let panel = 0; panel < PANELS; panel++) {
        const next = panel + 1 === PANELS
          ? wide : narrow + (wide - narrow) * Math.pow(0.5, PANELS - 1 - panel);
        const centre = 0.5 * (edge + next), half = 0.5 * (next - edge);
        for (const [node, weight] of GAUSS) {
          for (const side of [-1, 1]) {
            along(centre + side * half * node).forEach((v, n) => { sum[n] += weight * Math.abs(half) * v; });
          }
        }
        edge = next;
      }
    }
    const capacitance = sum[0] * d / area, force = sum[1] * d * d / area, moment = sum[2] * d * d / area;
    const torque = T.hinge ? force + moment / T.hinge.arm : 0;
    return { ideal: ideal(pose), carried: [capacitance, force, torque], over: [capacitance, force, force] };
  }

  // Of each quantity: ideal value, what the lamellae carry, what the excess multiplies; at 1 V.
  function closed(at) {
    const l = lamella(at), own = ideal(poseAt(at));
    return T.quantities.map((_, n) => [own[n], l.ideal[n] * l.carried[n], l.ideal[n] * l.over[n]]);
  }

  // A reading corrected, with first-order uncertainties.
  function correct(at, u, volts, uVolts) {
    const w = weights(at), here = closed(at);
    const slopes = at.map((_, k) => {
      if (!(u[k] > 0)) return null;
      const step = T.step * (T.axes[k].to - T.axes[k].from);
      const shifted = (by) => closed(at.map((v, m) => (m === k ? v + by : v)));
      const low = shifted(-step), high = shifted(step);
      return here.map((_, n) => [0, 1, 2].map((m) => (high[n][m] - low[n][m]) / (2 * step)));
    });
    return T.quantities.map((quantity, n) => {
      const [own, carried, over] = here[n];
      const square = n === 0 ? 1 : volts * volts;
      const excess = interpolated(w, quantity);
      const value = carried + over * excess.value;
      const known = Math.abs(over) * Math.hypot(excess.uncertainty, quantity.missed);
      let ideals = 0, squares = 0;
      slopes.forEach((s, k) => {
        if (!s) return;
        const [ofIdeal, ofCarried, ofOver] = s[n];
        const whole = ofCarried + ofOver * excess.value + over * excess.slopes[k] * reduced(T.axes[k], at[k])[1];
        ideals += Math.pow(ofIdeal * square * u[k], 2);
        squares += Math.pow(whole * square * u[k], 2);
      });
      if (n > 0) {
        ideals += Math.pow(own * 2 * volts * uVolts, 2);
        squares += Math.pow(value * 2 * volts * uVolts, 2);
      }
      return {
        ideal: own * square,
        uIdeal: Math.sqrt(ideals),
        factor: value / own,
        uFactor: known / own,
        corrected: value * square,
        uCorrected: Math.hypot(known * square, Math.sqrt(squares)),
      };
    });
  }

  // 1.0462(3): digits in parentheses are the standard uncertainty of the last digits.
  function concise(value, u) {
    const minus = (text) => (/[1-9]/.test(text) ? text.replace("-", "\u2212") : text.replace("-", ""));
    if (!(u > 0) || u < Math.abs(value) * 1e-12) return minus(String(Number(value.toPrecision(6))));
    const rounded = u.toExponential(1);
    const last = Number(rounded.split("e")[1]) - (rounded.startsWith("1") ? 1 : 0);
    if (last > 0) {
      const step = Math.pow(10, last);
      return minus(String(Math.round(value / step) * step)) + "(" + Math.round(u / step) * step + ")";
    }
    return minus(value.toFixed(-last)) + "(" + Math.round(u * Math.pow(10, -last)) + ")";
  }

  const PREFIXES = { "-18": "a", "-15": "f", "-12": "p", "-9": "n", "-6": "\u00b5", "-3": "m", 0: "", 3: "k", 6: "M" };
  function withUnit(value, u, unit) {
    const size = Math.max(Math.abs(value), u);
    const power = size > 0 ? Math.floor(Number(size.toExponential().split("e")[1]) / 3) * 3 : 0;
    const prefix = PREFIXES[power];
    if (prefix === undefined) return concise(value, u) + "\u00a0" + unit;
    const scale = Math.pow(10, power);
    return concise(value / scale, u / scale) + "\u00a0" + prefix + unit;
  }

  const form = document.getElementById("calculator-form");
  const message = document.getElementById("calculator-message");
  const NUMBER = /^[+\-\u2212]?(\d+([.,]\d*)?|[.,]\d+)(e[+\-]?\d+)?$/i;

  function typed(input) {
    const text = input.value.trim();
    return NUMBER.test(text) ? Number(text.replace(",", ".").replace("\u2212", "-")) : NaN;
  }

  function shown(problems) {
    message.textContent = problems.map((p) => p[1]).join(" ");
    for (const input of form.elements) {
      if (input.name) input.setAttribute("aria-invalid", String(problems.some((p) => p[0] === input.name)));
    }
  }

  function calculate() {
    const problems = [];
    const read = (name, label, empty) => {
      const input = form.elements.namedItem(name);
      if (empty !== undefined && input.value.trim() === "") return empty;
      const v = typed(input);
      if (!Number.isFinite(v)) problems.push([name, label + ": type a number."]);
      return v;
    };
    const uncertainty = (name, label) => {
      const v = read("u_" + name, "Uncertainty of the " + label, 0);
      if (v < 0) problems.push(["u_" + name, "Uncertainty of the " + label + ": no standard uncertainty is negative."]);
      return v;
    };
    const at = [], u = [];
    for (const axis of T.axes) {
      const v = read(axis.name, axis.name[0].toUpperCase() + axis.name.slice(1)) * axis.si;
      const slack = T.rounding * (axis.to - axis.from);
      if (v < axis.from - slack || v > axis.to + slack) {
        const end = (w) => Number((w / axis.si).toPrecision(9)).toString().replace("-", "\u2212");
        problems.push([axis.name, "The " + axis.name + " is outside the table, " + end(axis.from) + " to "
          + end(axis.to) + " " + axis.unit + "; nothing is extrapolated."]);
      }
      at.push(v);
      u.push(uncertainty(axis.name, axis.name) * axis.si);
    }
    const volts = read("voltage", "Voltage"), uVolts = uncertainty("voltage", "voltage");
    shown(problems);
    const good = problems.length === 0;
    const results = good ? correct(at, u, volts, uVolts) : [];
    T.quantities.forEach((quantity, n) => {
      const put = (column, value, text) => {
        const cell = document.getElementById("out-" + quantity.name + "-" + column);
        cell.textContent = good ? text() : "\u2013";
        if (good) cell.dataset.value = value.join(" "); else delete cell.dataset.value;
      };
      const r = results[n] || {};
      put("ideal", [r.ideal, r.uIdeal], () => withUnit(r.ideal, r.uIdeal, quantity.unit));
      put("factor", [r.factor, r.uFactor], () => concise(r.factor, r.uFactor));
      put("corrected", [r.corrected, r.uCorrected], () => withUnit(r.corrected, r.uCorrected, quantity.unit));
    });
  }

  form.addEventListener("input", calculate);
  form.addEventListener("submit", (event) => { event.preventDefault(); calculate(); });
  document.getElementById("calculator-body").hidden = false;
  calculate();
})();
