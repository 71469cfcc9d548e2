// src/lib/morph/errors.ts
var MorphError = class extends Error {
  code;
  place;
  mend;
  constructor(code, message, mend, place) {
    super(message);
    this.name = "MorphError";
    this.code = code;
    this.mend = mend;
    this.place = place;
  }
};

// src/lib/morph/number-text.ts
var EXACT_POWERS = Float64Array.from({ length: 23 }, (_, i) => Number(`1e${i}`));

// src/lib/morph/stl-ascii.ts
var CHECKPOINT_TRIANGLES = 1 << 14;

// src/lib/morph/stl-read.ts
var CHECKPOINT_TRIANGLES2 = 1 << 16;
var littleEndian = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;

// src/lib/morph/stl-write.ts
var littleEndian2 = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;

// src/lib/morph/basis.ts
function bernsteinBasis(count) {
  const degree = count - 1;
  return { count, degree, knots: null, greville: Float64Array.from({ length: count }, (_, i) => i / degree) };
}
function bsplineBasis(count, degree) {
  const spans = count - degree;
  const knots = new Float64Array(count + degree + 1);
  for (let i = 0; i < knots.length; i++) knots[i] = Math.min(1, Math.max(0, (i - degree) / spans));
  const greville = new Float64Array(count);
  for (let i = 0; i < count; i++) {
    let sum = 0;
    for (let k = 1; k <= degree; k++) sum += knots[i + k];
    greville[i] = sum / degree;
  }
  return { count, degree, knots, greville };
}
function boxBases(box) {
  const of = (count) => box.basis === "bspline" ? bsplineBasis(count, box.degree ?? 3) : bernsteinBasis(count);
  return [of(box.lattice[0]), of(box.lattice[1]), of(box.lattice[2])];
}
function bernstein(degree, t2, out, at = 0) {
  const s = 1 - t2;
  out[at] = 1;
  for (let j = 1; j <= degree; j++) {
    let carried = 0;
    for (let k = 0; k < j; k++) {
      const value = out[at + k];
      out[at + k] = carried + s * value;
      carried = t2 * value;
    }
    out[at + j] = carried;
  }
}
function bsplineValues(knots, degree, t2, out) {
  const count = knots.length - degree - 1;
  let span = degree;
  while (span < count - 1 && t2 >= knots[span + 1]) span++;
  out[0] = 1;
  for (let j = 1; j <= degree; j++) {
    let saved = 0;
    for (let r = 0; r < j; r++) {
      const right = knots[span + r + 1] - t2;
      const left = t2 - knots[span + 1 - j + r];
      const temp = out[r] / (right + left);
      out[r] = saved + right * temp;
      saved = left * temp;
    }
    out[j] = saved;
  }
  return span - degree;
}
function evaluateBasis(basis, t2, values, slopes) {
  const { count, degree, knots } = basis;
  if (!knots) {
    bernstein(degree - 1, t2, slopes);
    slopes[degree] = 0;
    let before = 0;
    for (let i = 0; i <= degree; i++) {
      const low = slopes[i];
      values[i] = (1 - t2) * low + t2 * before;
      slopes[i] = degree * (before - low);
      before = low;
    }
    return;
  }
  values.fill(0, 0, count);
  slopes.fill(0, 0, count);
  const local = new Float64Array(degree + 1);
  const first = bsplineValues(knots, degree, t2, local);
  for (let k = 0; k <= degree; k++) values[first + k] = local[k];
  if (degree === 0) return;
  const lower = new Float64Array(degree);
  const inner = knots.subarray(1, knots.length - 1);
  const lowFirst = bsplineValues(inner, degree - 1, t2, lower) + 1;
  for (let k = 0; k < degree; k++) {
    const i = lowFirst + k;
    const q = degree * lower[k] / (knots[i + degree] - knots[i]);
    slopes[i] += q;
    slopes[i - 1] -= q;
  }
}

// src/lib/morph/box.ts
var MIN_POINTS = 2;
var MAX_POINTS = 20;
var MAX_LATTICE = 4e3;
var MAX_HELD = 3;
var MAX_BSPLINE_DEGREE = 3;
var AXES = ["x", "y", "z"];
var FACES = [
  ["u0", "u1"],
  ["v0", "v1"],
  ["w0", "w1"]
];
function pointIndex(lattice, i, j, k) {
  return (i * lattice[1] + j) * lattice[2] + k;
}
function boxAxes(box) {
  const [x, y, z, w] = box.rotation;
  const s = 2 / (x * x + y * y + z * z + w * w);
  return Float64Array.of(
    1 - s * (y * y + z * z),
    s * (x * y + w * z),
    s * (x * z - w * y),
    s * (x * y - w * z),
    1 - s * (x * x + z * z),
    s * (y * z + w * x),
    s * (x * z + w * y),
    s * (y * z - w * x),
    1 - s * (x * x + y * y)
  );
}
function checkBox(box) {
  const label = box.name ?? box.id;
  const refuse2 = (message, mend) => {
    throw new MorphError("box-invalid", `Design box "${label}": ${message}`, mend, { box: label });
  };
  const numbers = [...box.centre, ...box.halfSize, ...box.rotation];
  if (box.centre.length !== 3 || box.halfSize.length !== 3 || box.rotation.length !== 4 || !numbers.every(Number.isFinite)) {
    refuse2("centre, half-size or rotation is not a list of finite numbers.", "Give 3, 3 and 4 finite numbers.");
  }
  if (box.halfSize.some((h) => h <= 0)) refuse2("a half-size is not positive.", "Give half-sizes above 0.");
  const q = Math.hypot(...box.rotation);
  if (Math.abs(q - 1) > 1e-3) {
    refuse2(`the rotation has length ${q.toPrecision(4)}.`, "Give a unit quaternion [x, y, z, w].");
  }
  if (box.lattice.length !== 3 || box.lattice.some((n) => !Number.isInteger(n) || n < MIN_POINTS || n > MAX_POINTS)) {
    refuse2(`the lattice ${box.lattice.join(" x ")} is out of range.`, "Give 2 to 20 points along each axis.");
  }
  if (box.lattice[0] * box.lattice[1] * box.lattice[2] > MAX_LATTICE) {
    refuse2(`the lattice ${box.lattice.join(" x ")} has more than 4000 points.`, "Give at most 4000 points in all.");
  }
  if (box.basis !== "bernstein" && box.basis !== "bspline") {
    refuse2(`basis "${String(box.basis)}" is unknown.`, 'Give "bernstein" or "bspline".');
  }
  if (box.basis === "bspline") {
    const degree = box.degree ?? MAX_BSPLINE_DEGREE;
    if (!Number.isInteger(degree) || degree < 1 || degree > MAX_BSPLINE_DEGREE) {
      refuse2(`B-spline degree ${degree} is out of range.`, "Give a degree of 1, 2 or 3.");
    }
    if (box.lattice.some((n) => n <= degree)) {
      refuse2(
        `a B-spline of degree ${degree} needs more points than its degree along each axis.`,
        `Give at least ${degree + 1} points along each axis, or a lower degree.`
      );
    }
  }
  for (const pair of FACES) {
    for (const face of pair) {
      const held = box.held[face];
      if (!Number.isInteger(held) || held < 0 || held > MAX_HELD) {
        refuse2(`${held} held planes at face ${face} are out of range.`, "Give 0, 1, 2 or 3 held planes.");
      }
    }
  }
  const points = box.lattice[0] * box.lattice[1] * box.lattice[2];
  const stray = box.heldPoints?.find((p) => !Number.isInteger(p) || p < 0 || p >= points);
  if (stray !== void 0) {
    refuse2(`held point ${stray} is not in the lattice.`, `Give indices from 0 to ${points - 1}.`);
  }
  if (new Set(box.axes).size !== box.axes.length || box.axes.some((a) => !AXES.includes(a))) {
    refuse2(`the axes ${box.axes.join(", ")} are not a choice of x, y, z.`, "Give each axis at most once.");
  }
  if (box.frame !== "box" && box.frame !== "world") refuse2("the frame is unknown.", 'Give "box" or "world".');
  if (box.axes.length === 0 || freePoints(box).length === 0) {
    throw new MorphError(
      "no-free-points",
      `Design box "${label}": no control point may move.`,
      box.axes.length === 0 ? "Allow at least one axis." : "Hold fewer planes or points, or add control points: along every axis at least one plane must stay free.",
      { box: label }
    );
  }
}
function freePoints(box) {
  const out = [];
  const [nu, nv, nw] = box.lattice;
  const { u0, u1, v0, v1, w0, w1 } = box.held;
  const byHand = new Set(box.heldPoints);
  for (let i = u0; i < nu - u1; i++) {
    for (let j = v0; j < nv - v1; j++) {
      for (let k = w0; k < nw - w1; k++) {
        const p = pointIndex(box.lattice, i, j, k);
        if (!byHand.has(p)) out.push(p);
      }
    }
  }
  return Uint32Array.from(out);
}
function boxDirections(box) {
  const columns = box.frame === "box" ? boxAxes(box) : Float64Array.of(1, 0, 0, 0, 1, 0, 0, 0, 1);
  return AXES.filter((a) => box.axes.includes(a)).map((a) => {
    const c = 3 * AXES.indexOf(a);
    return [columns[c], columns[c + 1], columns[c + 2]];
  });
}
function embed(positions, box, options = {}) {
  const axes = boxAxes(box);
  const aligned = box.rotation[0] === 0 && box.rotation[1] === 0 && box.rotation[2] === 0;
  const [cx, cy, cz] = box.centre;
  const [hu, hv, hw] = box.halfSize;
  const n = positions.length / 3;
  let ids = new Uint32Array(Math.min(n, 1024));
  let uvw = new Float64Array(3 * ids.length);
  let count = 0;
  const [a0, a1, a2, b0, b1, b2, c0, c1, c2] = axes;
  for (let v = 0; v < n; v++) {
    const x = positions[3 * v];
    const y = positions[3 * v + 1];
    const z = positions[3 * v + 2];
    let u, w, t2;
    if (aligned) {
      u = (x - (cx - hu)) / (2 * hu);
      t2 = (y - (cy - hv)) / (2 * hv);
      w = (z - (cz - hw)) / (2 * hw);
    } else {
      const dx = x - cx;
      const dy = y - cy;
      const dz = z - cz;
      u = 0.5 + (dx * a0 + dy * a1 + dz * a2) / (2 * hu);
      t2 = 0.5 + (dx * b0 + dy * b1 + dz * b2) / (2 * hv);
      w = 0.5 + (dx * c0 + dy * c1 + dz * c2) / (2 * hw);
    }
    if (u < 0 || u > 1 || t2 < 0 || t2 > 1 || w < 0 || w > 1) continue;
    if (count === ids.length) {
      const size = Math.min(n, 2 * count);
      const grownIds = new Uint32Array(size);
      grownIds.set(ids);
      ids = grownIds;
      const grown2 = new Float64Array(3 * size);
      grown2.set(uvw);
      uvw = grown2;
    }
    ids[count] = v;
    uvw[3 * count] = u;
    uvw[3 * count + 1] = t2;
    uvw[3 * count + 2] = w;
    count++;
  }
  options.checkpoint?.(1);
  return { inside: ids.slice(0, count), uvw: uvw.slice(0, 3 * count) };
}

// src/lib/morph/symmetry.ts
var SAME_BOX = 1e-6;
var ON_PLANE = 1e-6;
function checkPlane(plane) {
  const numbers = [...plane.point, ...plane.normal];
  const length = Math.hypot(...plane.normal);
  if (numbers.length !== 6 || !numbers.every(Number.isFinite) || Math.abs(length - 1) > 1e-6) {
    throw new MorphError(
      "symmetry-invalid",
      "The symmetry plane is not a point and a unit normal.",
      "Give three finite coordinates and a normal of length 1."
    );
  }
}
function planeNormal({ normal }) {
  const length = Math.hypot(...normal);
  const unit = normal.map((x) => x / length);
  const axis = unit.findIndex((x) => Math.abs(Math.abs(x) - 1) < 1e-12);
  return axis < 0 ? unit : [0, 1, 2].map((d) => d === axis ? 1 : 0);
}
function reflectVector(v, n) {
  const s = 2 * (v[0] * n[0] + v[1] * n[1] + v[2] * n[2]);
  return [v[0] - s * n[0], v[1] - s * n[1], v[2] - s * n[2]];
}
var alongNormal = (p, plane, n) => (p[0] - plane.point[0]) * n[0] + (p[1] - plane.point[1]) * n[1] + (p[2] - plane.point[2]) * n[2];
function rotationOf(u, v, w) {
  const squares = [1 + u[0] - v[1] - w[2], 1 - u[0] + v[1] - w[2], 1 - u[0] - v[1] + w[2], 1 + u[0] + v[1] + w[2]];
  const k = squares.indexOf(Math.max(...squares));
  const s = 0.5 / Math.sqrt(squares[k]);
  const xy = u[1] + v[0];
  const xz = u[2] + w[0];
  const yz = v[2] + w[1];
  const q = [
    [squares[0], xy, xz, v[2] - w[1]],
    [xy, squares[1], yz, w[0] - u[2]],
    [xz, yz, squares[2], u[1] - v[0]],
    [v[2] - w[1], w[0] - u[2], u[1] - v[0], squares[3]]
  ][k];
  return q.map((x) => x * s);
}
function mirrorBox(box, plane) {
  const n = planeNormal(plane);
  const axes = boxAxes(box);
  const columns = [0, 1, 2].map((d) => [axes[3 * d], axes[3 * d + 1], axes[3 * d + 2]]);
  const cosines = columns.map((c) => Math.abs(c[0] * n[0] + c[1] * n[1] + c[2] * n[2]));
  const turned = cosines.indexOf(Math.max(...cosines));
  const mirrored = columns.map((c, d) => {
    const r = reflectVector(c, n);
    return d === turned ? r.map((x) => -x) : r;
  });
  const s = 2 * alongNormal(box.centre, plane, n);
  const [nu, nv, nw] = box.lattice;
  const points = new Uint32Array(nu * nv * nw);
  for (let i = 0, p = 0; i < nu; i++) {
    for (let j = 0; j < nv; j++) {
      for (let k = 0; k < nw; k++, p++) {
        const a = turned === 0 ? nu - 1 - i : i;
        const b = turned === 1 ? nv - 1 - j : j;
        const c = turned === 2 ? nw - 1 - k : k;
        points[p] = (a * nv + b) * nw + c;
      }
    }
  }
  const { u0, u1, v0, v1, w0, w1 } = box.held;
  const exact = cosines[turned] > 1 - 1e-12;
  return {
    points,
    box: {
      ...box,
      centre: box.centre.map((x, d) => x - s * n[d]),
      rotation: exact ? box.rotation : rotationOf(mirrored[0], mirrored[1], mirrored[2]),
      held: {
        u0: turned === 0 ? u1 : u0,
        u1: turned === 0 ? u0 : u1,
        v0: turned === 1 ? v1 : v0,
        v1: turned === 1 ? v0 : v1,
        w0: turned === 2 ? w1 : w0,
        w1: turned === 2 ? w0 : w1
      },
      heldPoints: box.heldPoints && Array.from(box.heldPoints, (p) => points[p])
    }
  };
}
function samePlace(a, b) {
  const size = Math.max(...a.halfSize);
  const close2 = (x, y, unit) => x.every((v, i) => Math.abs(v - y[i]) <= SAME_BOX * unit);
  const left = boxAxes(a);
  const right = boxAxes(b);
  return close2(a.centre, b.centre, size) && close2(a.halfSize, b.halfSize, size) && close2(Array.from(left), Array.from(right), 1) && a.lattice.every((n, d) => n === b.lattice[d]) && a.basis === b.basis && (a.basis === "bernstein" || (a.degree ?? 3) === (b.degree ?? 3));
}
function tieBoxes(given, plane) {
  checkPlane(plane);
  const normal = planeNormal(plane);
  const boxes = given.slice();
  const ties = [];
  const done = /* @__PURE__ */ new Set();
  given.forEach((box, b) => {
    if (done.has(b)) return;
    done.add(b);
    let image = mirrorBox(box, plane);
    if (samePlace(box, image.box)) {
      const s = alongNormal(box.centre, plane, normal);
      const centred = { ...box, centre: box.centre.map((x, d) => x - s * normal[d]) };
      boxes[b] = centred;
      ties.push({ box: b, image: b, points: image.points });
      return;
    }
    const partner = given.findIndex((other, o) => o > b && !done.has(o) && samePlace(other, image.box));
    if (partner >= 0) {
      done.add(partner);
      image = mirrorBox(box, plane);
      boxes[partner] = { ...given[partner], centre: image.box.centre, rotation: image.box.rotation };
      ties.push({ box: b, image: partner, points: image.points });
      return;
    }
    boxes.push({ ...image.box, name: `${box.name ?? box.id}, mirrored` });
    ties.push({ box: b, image: boxes.length - 1, points: image.points });
  });
  return { boxes, ties, normal };
}
function onPlane(positions, plane) {
  const n = planeNormal(plane);
  let low = Infinity;
  let high = -Infinity;
  for (let i = 0; i < positions.length; i++) {
    if (positions[i] < low) low = positions[i];
    if (positions[i] > high) high = positions[i];
  }
  const tolerance = ON_PLANE * (high - low);
  const out = new Uint8Array(positions.length / 3);
  for (let v = 0; v < out.length; v++) {
    const x = (positions[3 * v] - plane.point[0]) * n[0];
    const y = (positions[3 * v + 1] - plane.point[1]) * n[1];
    const z = (positions[3 * v + 2] - plane.point[2]) * n[2];
    if (Math.abs(x + y + z) <= tolerance) out[v] = 1;
  }
  return out;
}
function mirrorPartners(positions, moved, plane) {
  const n = planeNormal(plane);
  let low = Infinity;
  let high = -Infinity;
  for (let i = 0; i < positions.length; i++) {
    if (positions[i] < low) low = positions[i];
    if (positions[i] > high) high = positions[i];
  }
  const unit = 1e-9 * (high - low) || 1;
  const key = (x, y, z, k) => {
    const a = Math.floor(x / unit + (k & 1 ? 0.5 : 0));
    const b = Math.floor(y / unit + (k & 2 ? 0.5 : 0));
    const c = Math.floor(z / unit + (k & 4 ? 0.5 : 0));
    return `${a} ${b} ${c}`;
  };
  const out = new Int32Array(moved.length).fill(-1);
  for (let k = 0; k < 8; k++) {
    const index = /* @__PURE__ */ new Map();
    let missing = 0;
    for (let i = 0; i < moved.length; i++) {
      if (out[i] >= 0) continue;
      missing++;
      const v = 3 * moved[i];
      index.set(key(positions[v], positions[v + 1], positions[v + 2], k), i);
    }
    if (missing === 0) break;
    for (let i = 0; i < moved.length; i++) {
      if (out[i] >= 0) continue;
      const v = 3 * moved[i];
      const p = [positions[v], positions[v + 1], positions[v + 2]];
      const s = 2 * alongNormal(p, plane, n);
      const j = index.get(key(p[0] - s * n[0], p[1] - s * n[1], p[2] - s * n[2], k));
      if (j === void 0 || out[j] >= 0 && out[j] !== i) continue;
      out[i] = j;
      out[j] = i;
    }
    if (k === 0 && missing > 0 && out.every((j) => j < 0)) break;
  }
  return out;
}

// src/lib/morph/surface.ts
var CHECKPOINT_TRIANGLES3 = 1 << 17;
function isWatertight(triangles, ignored = null) {
  let sumA = 0;
  let sumB = 0;
  for (let i = 0; i < triangles.length; i += 3) {
    for (let k = 0; k < 3; k++) {
      const a = triangles[i + k];
      const b = triangles[i + (k === 2 ? 0 : k + 1)];
      if (a === b || ignored && ignored[a] & ignored[b]) continue;
      const low = a < b ? a : b;
      const high = a < b ? b : a;
      let h = Math.imul(low ^ 2654435769, 2246822507) ^ Math.imul(high + 2135587861, 3266489909);
      h ^= h >>> 15;
      h = Math.imul(h, 739982445);
      h ^= h >>> 12;
      let g = Math.imul(h ^ high, 695872825) + low;
      g ^= g >>> 15;
      g = Math.imul(g, 2246822507);
      g ^= g >>> 13;
      if (a < b) {
        sumA = sumA + h | 0;
        sumB = sumB + g | 0;
      } else {
        sumA = sumA - h | 0;
        sumB = sumB - g | 0;
      }
    }
  }
  return sumA === 0 && sumB === 0;
}
function volumeOf(positions, triangles, origin = [0, 0, 0]) {
  const [ox, oy, oz] = origin;
  let sum = 0;
  for (let i = 0; i < triangles.length; i += 3) {
    const a = 3 * triangles[i];
    const b = 3 * triangles[i + 1];
    const c = 3 * triangles[i + 2];
    const ax = positions[a] - ox;
    const ay = positions[a + 1] - oy;
    const az = positions[a + 2] - oz;
    const bx = positions[b] - ox;
    const by = positions[b + 1] - oy;
    const bz = positions[b + 2] - oz;
    const cx = positions[c] - ox;
    const cy = positions[c + 1] - oy;
    const cz = positions[c + 2] - oz;
    sum += ax * (by * cz - bz * cy) + ay * (bz * cx - bx * cz) + az * (bx * cy - by * cx);
  }
  return sum / 6;
}
function boundsCentre(positions) {
  const centre = [0, 0, 0];
  if (positions.length === 0) return centre;
  for (let d = 0; d < 3; d++) {
    let low = Infinity;
    let high = -Infinity;
    for (let i = d; i < positions.length; i += 3) {
      const x = positions[i];
      if (x < low) low = x;
      if (x > high) high = x;
    }
    centre[d] = (low + high) / 2;
  }
  return centre;
}
function volumeGradient(positions, triangles, origin = [0, 0, 0]) {
  const [ox, oy, oz] = origin;
  const out = new Float64Array(positions.length);
  for (let i = 0; i < triangles.length; i += 3) {
    const a = 3 * triangles[i];
    const b = 3 * triangles[i + 1];
    const c = 3 * triangles[i + 2];
    addCross(out, a, positions, b, c, ox, oy, oz);
    addCross(out, b, positions, c, a, ox, oy, oz);
    addCross(out, c, positions, a, b, ox, oy, oz);
  }
  return out;
}
function addCross(out, v, p, b, c, ox, oy, oz) {
  const bx = p[b] - ox;
  const by = p[b + 1] - oy;
  const bz = p[b + 2] - oz;
  const cx = p[c] - ox;
  const cy = p[c + 1] - oy;
  const cz = p[c + 2] - oz;
  out[v] += (by * cz - bz * cy) / 6;
  out[v + 1] += (bz * cx - bx * cz) / 6;
  out[v + 2] += (bx * cy - by * cx) / 6;
}
function geometry(positions, triangles, options = {}) {
  const n = positions.length / 3;
  const mass = new Float64Array(n);
  const normals = new Float64Array(3 * n);
  let total = 0;
  for (let i = 0; i < triangles.length; i += 3) {
    const a = triangles[i];
    const b = triangles[i + 1];
    const c = triangles[i + 2];
    const ax = positions[3 * a];
    const ay = positions[3 * a + 1];
    const az = positions[3 * a + 2];
    const ux = positions[3 * b] - ax;
    const uy = positions[3 * b + 1] - ay;
    const uz = positions[3 * b + 2] - az;
    const vx = positions[3 * c] - ax;
    const vy = positions[3 * c + 1] - ay;
    const vz = positions[3 * c + 2] - az;
    const x = uy * vz - uz * vy;
    const y = uz * vx - ux * vz;
    const z = ux * vy - uy * vx;
    const area = 0.5 * Math.sqrt(x * x + y * y + z * z);
    total += area;
    mass[a] += area / 3;
    mass[b] += area / 3;
    mass[c] += area / 3;
    normals[3 * a] += x;
    normals[3 * a + 1] += y;
    normals[3 * a + 2] += z;
    normals[3 * b] += x;
    normals[3 * b + 1] += y;
    normals[3 * b + 2] += z;
    normals[3 * c] += x;
    normals[3 * c + 1] += y;
    normals[3 * c + 2] += z;
    if (options.checkpoint && i % (3 * CHECKPOINT_TRIANGLES3) === 0) options.checkpoint(i / triangles.length);
  }
  for (let i = 0; i < normals.length; i += 3) {
    const x = normals[i];
    const y = normals[i + 1];
    const z = normals[i + 2];
    const length = Math.sqrt(x * x + y * y + z * z);
    if (length > 0) {
      normals[i] = x / length;
      normals[i + 1] = y / length;
      normals[i + 2] = z / length;
    }
  }
  return { mass, normals, area: total };
}
function checkMesh(positions, triangles) {
  const n = positions.length / 3;
  if (!Number.isInteger(n) || triangles.length % 3 !== 0 || triangles.length === 0) {
    throw new MorphError(
      "mesh-shape",
      `${positions.length} coordinates and ${triangles.length} corners do not make a triangle mesh.`,
      "Give three coordinates per vertex and three corners per triangle, at least one triangle."
    );
  }
  for (let i = 0; i < triangles.length; i++) {
    if (triangles[i] >= n) {
      const triangle = Math.floor(i / 3);
      throw new MorphError(
        "mesh-shape",
        `Triangle ${triangle} refers to vertex ${triangles[i]}, but there are only ${n}.`,
        "Give vertex indices from 0 to the number of vertices less one.",
        { triangle, vertex: triangles[i] }
      );
    }
  }
  for (let i = 0; i < positions.length; i++) {
    if (!Number.isFinite(positions[i])) {
      const vertex = Math.floor(i / 3);
      throw new MorphError(
        "mesh-non-finite",
        `Vertex ${vertex} has a coordinate that is not a finite number.`,
        "Repair that vertex where the surface was made.",
        { vertex }
      );
    }
  }
}
function makeSurface(positions, triangles, options = {}) {
  checkMesh(positions, triangles);
  const closed = isWatertight(triangles);
  const { symmetry } = options;
  const half = !closed && symmetry !== void 0 && isWatertight(triangles, onPlane(positions, symmetry));
  const { mass, normals, area } = geometry(positions, triangles, options);
  const origin = closed ? boundsCentre(positions) : half ? symmetry.point : [0, 0, 0];
  options.checkpoint?.(1);
  return {
    positions,
    triangles,
    mass,
    normals,
    volumeGradient: volumeGradient(positions, triangles, origin),
    area,
    volume: volumeOf(positions, triangles, origin),
    watertight: closed || half,
    origin
  };
}

// src/lib/morph/map-csv.ts
var CHECKPOINT_ROWS = 1 << 16;

// src/lib/morph/map-match.ts
import { BufferAttribute, BufferGeometry, Triangle, Vector3 } from "three";
import { MeshBVH } from "three-mesh-bvh";
var CHECKPOINT_ROWS2 = 1 << 14;

// src/lib/morph/growing-factor.ts
var GrowingFactor = class {
  /** Row i of the lower triangle; entries beyond i are left over and not read. */
  rows = [];
  get size() {
    return this.rows.length;
  }
  /** L^-1 of a right side; its squared length is what the rows in the factor explain of a row with these inner products. */
  forward(right) {
    const { rows } = this;
    const y = Float64Array.from(right);
    for (let i = 0; i < rows.length; i++) {
      const row = rows[i];
      let sum = y[i];
      for (let k = 0; k < i; k++) sum -= row[k] * y[k];
      y[i] = sum / row[i];
    }
    return y;
  }
  /** L^-T, in place. */
  back(y) {
    const { rows } = this;
    for (let i = rows.length - 1; i >= 0; i--) {
      const row = rows[i];
      const x = y[i] / row[i];
      y[i] = x;
      for (let k = 0; k < i; k++) y[k] -= row[k] * x;
    }
    return y;
  }
  solve(right) {
    return this.back(this.forward(right));
  }
  /**
   * @param y forward() of the new row's inner products with those in the factor
   * @param apart its squared length less that of y, > 0
   */
  add(y, apart) {
    const row = new Float64Array(y.length + 1);
    row.set(y);
    row[y.length] = Math.sqrt(apart);
    this.rows.push(row);
  }
  drop(index) {
    const { rows } = this;
    rows.splice(index, 1);
    for (let c = index; c < rows.length; c++) {
      const length = Math.hypot(rows[c][c], rows[c][c + 1]);
      const cosine2 = rows[c][c] / length;
      const sine = rows[c][c + 1] / length;
      for (let i = c; i < rows.length; i++) {
        const row = rows[i];
        const a = row[c];
        const b = row[c + 1];
        row[c] = cosine2 * a + sine * b;
        row[c + 1] = cosine2 * b - sine * a;
      }
    }
  }
};

// src/lib/morph/active-set.ts
var DEPENDENT = 1e-10;
var APART = 1e-6;
function solveActiveSet({ gram, slack, equality, tolerance, guess }) {
  const m2 = slack.length;
  const multipliers = new Array(m2).fill(0);
  const isActive = new Array(m2).fill(false);
  let active = [];
  const now = (i) => active.reduce((sum, j) => sum + gram[i][j] * multipliers[j], slack[i]);
  const factor = new GrowingFactor();
  const bounds = () => active.map((i) => -slack[i]);
  const project = (p) => {
    const y = factor.forward(active.map((i) => gram[i][p]));
    return { y, apart: y.reduce((rest, v) => rest - v * v, gram[p][p]) };
  };
  const activate = (p, { y, apart }) => {
    factor.add(y, apart);
    active.push(p);
    isActive[p] = true;
  };
  const drop = (p) => {
    factor.drop(active.indexOf(p));
    active = active.filter((j) => j !== p);
    isActive[p] = false;
  };
  const add = (p) => {
    const sign = now(p) > 0 ? -1 : 1;
    for (; ; ) {
      const projected = project(p);
      const { apart } = projected;
      const r = factor.back(projected.y.slice());
      let blocking = -1;
      let t1 = Infinity;
      active.forEach((j, k) => {
        if (equality[j] || !(sign * r[k] > 0)) return;
        const t4 = multipliers[j] / (sign * r[k]);
        if (t4 < t1) {
          t1 = t4;
          blocking = j;
        }
      });
      const gap = now(p) + (isActive[p] ? 0 : gram[p][p] * multipliers[p]);
      const t2 = apart > DEPENDENT * gram[p][p] ? Math.abs(gap) / apart : Infinity;
      const t3 = Math.min(t1, t2);
      if (t3 === Infinity) {
        if (Math.abs(gap) <= 10 * tolerance[p]) return null;
        return [p, ...active.filter((_, k) => Math.abs(r[k]) > 1e-6)];
      }
      active.forEach((j, k) => multipliers[j] -= sign * t3 * r[k]);
      multipliers[p] += sign * t3;
      if (t2 <= t1) {
        activate(p, projected);
        return null;
      }
      multipliers[blocking] = 0;
      drop(blocking);
    }
  };
  const start = (guessed) => {
    for (let i = 0; i < m2; i++) {
      if (!guessed[i] || isActive[i]) continue;
      const projected = project(i);
      if (projected.apart > APART * gram[i][i]) activate(i, projected);
    }
    for (; ; ) {
      const solved = factor.solve(bounds());
      const wrong = active.filter((i, k) => !equality[i] && !(solved[k] > 0));
      if (wrong.length === 0) {
        active.forEach((i, k) => multipliers[i] = solved[k]);
        return;
      }
      wrong.forEach(drop);
    }
  };
  for (let i = 0; i < m2; i++) {
    if (!equality[i]) continue;
    const conflict = add(i);
    if (conflict) return { multipliers, active: isActive, conflict };
  }
  if (guess) start(guess);
  const skipped = /* @__PURE__ */ new Set();
  for (let round = 0; round < 50 * m2 + 50; round++) {
    let worst = -1;
    let most = 0;
    for (let i = 0; i < m2; i++) {
      if (isActive[i] || equality[i] || skipped.has(i)) continue;
      const value = now(i);
      if (value < -tolerance[i] && value < most) {
        most = value;
        worst = i;
      }
    }
    if (worst < 0) break;
    const conflict = add(worst);
    if (conflict) return { multipliers, active: isActive, conflict };
    if (!isActive[worst]) {
      multipliers[worst] = 0;
      skipped.add(worst);
      const again = factor.solve(bounds());
      active.forEach((i, k) => multipliers[i] = equality[i] ? again[k] : Math.max(0, again[k]));
    }
  }
  return { multipliers, active: isActive, conflict: null };
}

// src/lib/morph/qp.ts
import { CholeskyDecomposition, Matrix } from "ml-matrix";
import numeric from "numeric";
function solveQuadraticProgram(program) {
  const { hessian, gradient: gradient2, rows, bounds, equalities } = program;
  const n = gradient2.length;
  const factor = new CholeskyDecomposition(new Matrix(hessian));
  if (!factor.isPositiveDefinite()) {
    throw new MorphError(
      "metric-singular",
      "The quadratic form is not positive definite.",
      "Remove constraints that repeat each other."
    );
  }
  const free = factor.solve(Matrix.columnVector(gradient2)).to1DArray();
  const m2 = rows.length;
  const multipliers = new Array(m2).fill(0);
  const active = new Array(m2).fill(false);
  if (m2 === 0) {
    const x2 = free.map((v) => -v);
    return { x: x2, value: x2.reduce((sum, v, i) => sum + 0.5 * v * gradient2[i], 0), multipliers, active };
  }
  const columns = Array.from({ length: n }, (_, i) => rows.map((row) => row[i]));
  const result = numeric.solveQP(
    hessian,
    gradient2.map((g) => -g),
    columns,
    bounds,
    equalities
  );
  if (result.message !== "") {
    throw new MorphError(
      "constraint-conflict",
      "The constraints contradict each other: no move keeps all of them.",
      "Relax or remove one of them."
    );
  }
  const x = Array.from({ length: n }, (_, i) => result.solution[i]);
  const indices = result.iact.filter((k) => k > 0).map((k) => k - 1);
  if (indices.length > 0) {
    const a = new Matrix(indices.map((k) => rows[k]));
    const z = factor.solve(a.transpose());
    const product = a.mmul(z);
    const system = product.add(product.transpose()).mul(0.5);
    const right = indices.map((k) => rows[k].reduce((sum, c, i) => sum + c * (x[i] + free[i]), 0));
    const lambda = new CholeskyDecomposition(system).solve(Matrix.columnVector(right)).to1DArray();
    indices.forEach((k, i) => {
      multipliers[k] = lambda[i];
      active[k] = true;
    });
  }
  let value = 0;
  for (let i = 0; i < n; i++) {
    value += gradient2[i] * x[i];
    for (let j = 0; j < n; j++) value += 0.5 * x[i] * hessian[i][j] * x[j];
  }
  return { x, value, multipliers, active };
}

// src/lib/morph/system.ts
import { CholeskyDecomposition as CholeskyDecomposition2, Matrix as Matrix2 } from "ml-matrix";
var WORLD = [
  [1, 0, 0],
  [0, 1, 0],
  [0, 0, 1]
];
var cosine = (a, b) => a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
var parallel = (a, b) => Math.abs(cosine(a, b)) > 1 - 1e-14;
var opposite = (a, b) => cosine(a, b) < -1 + 1e-12;
function mirrorFrame(normal) {
  if (normal.some((x2) => x2 === 1)) return WORLD;
  const [x, y, z] = normal;
  const sign = z >= 0 ? 1 : -1;
  const a = -1 / (sign + z);
  return [[1 + sign * x * x * a, sign * x * y * a, -sign * x], [x * y * a, sign + y * y * a, -y], normal];
}
function intersect(a, b) {
  const out = [];
  for (let i = 0, j = 0; i < a.length && j < b.length; ) {
    if (a[i] < b[j]) i++;
    else if (a[i] > b[j]) j++;
    else {
      out.push(a[i]);
      i++;
      j++;
    }
  }
  return Uint32Array.from(out);
}
var ReducedSystem = class {
  /** @param ties mirror images among the operators' boxes; none: each box stands alone */
  constructor(operators, surface2, smoothing, eps, ties = null, checkpoint) {
    this.operators = operators;
    this.ties = ties;
    const count = operators.length;
    const own = operators.map(
      (op, b) => op.metric(surface2, smoothing, checkpoint && ((f) => checkpoint(0.8 * (b + f) / count)))
    );
    const cross = /* @__PURE__ */ new Map();
    const component = operators.map((_, b) => b);
    const join = (a, b) => {
      const from = component[a];
      const to = component[b];
      for (let c = 0; c < count; c++) if (component[c] === from) component[c] = to;
    };
    for (let a = 0; a < count; a++) {
      for (let b = 0; b < a; b++) {
        const both = intersect(operators[a].inside, operators[b].inside);
        if (both.length === 0) continue;
        cross.set(a * count + b, operators[a].crossMetric(operators[b], both, surface2, smoothing));
        join(a, b);
      }
    }
    for (const { box, image } of ties?.list ?? []) join(box, image);
    checkpoint?.(0.85);
    for (const root of new Set(component)) {
      const members = operators.map((_, b) => b).filter((b) => component[b] === root);
      this.addComponent(members, own, cross, eps);
    }
    this.unknowns = this.groups.reduce((sum, g) => sum + g.size, 0);
    checkpoint?.(1);
  }
  operators;
  ties;
  groups = [];
  unknowns;
  /** The unknowns of some boxes: by direction of the first member. */
  columnsOf(boxes) {
    const frame = this.ties ? mirrorFrame(this.ties.normal) : WORLD;
    const columns = [];
    const add = (members) => {
      if (members[0].points.length > 0) columns.push({ members, count: members[0].points.length, offset: 0 });
    };
    for (const box of boxes) {
      const operator = this.operators[box];
      const own = boxDirections(operator.box);
      const directions = own.length === 3 ? frame : own;
      const tie = this.ties?.list.find((t2) => t2.box === box);
      if (!this.ties) for (const direction2 of directions) add([{ box, direction: direction2, points: operator.free }]);
      if (!this.ties || !tie) continue;
      const other = this.operators[tie.image];
      for (const direction2 of directions) {
        const mirrored = reflectVector(direction2, this.ties.normal);
        if (tie.image === box && own.length < 3 && !own.some((d) => parallel(d, mirrored))) {
          const label = operator.box.name ?? operator.box.id;
          throw new MorphError(
            "box-invalid",
            `Design box "${label}": the axes allowed are not symmetric about the study's symmetry plane.`,
            "Allow all three axes, or axes along and across the plane, or give the axes in the box's own frame.",
            { box: label }
          );
        }
        const points = operator.free.filter((p) => {
          const q = tie.points[p];
          if (other.freeIndex[q] < 0) return false;
          if (tie.image !== box) return true;
          return p < q || p === q && !opposite(direction2, mirrored);
        });
        add([
          { box, direction: direction2, points },
          { box: tie.image, direction: mirrored, points: points.map((p) => tie.points[p]) }
        ]);
      }
    }
    return columns;
  }
  addComponent(members, own, cross, eps) {
    const columns = this.columnsOf(members);
    if (columns.length === 0) return;
    const distinct = [];
    for (const { members: list } of columns) {
      for (const { direction: d } of list) if (!distinct.some((e) => parallel(d, e))) distinct.push(d);
    }
    const orthogonal = distinct.every((d, i) => distinct.every((e, j) => i === j || Math.abs(cosine(d, e)) < 1e-14)) && columns.every(({ members: [a, b] }) => !b || parallel(a.direction, b.direction));
    const factors = /* @__PURE__ */ new Map();
    const add = (list, key) => {
      let size = 0;
      for (const column of list) {
        column.offset = size;
        size += column.count;
      }
      let made = key ? factors.get(key) : void 0;
      if (!made) {
        made = this.factorise(list, size, own, cross, eps);
        if (key) factors.set(key, made);
      }
      this.groups.push({ columns: list, size, ...made });
    };
    if (!orthogonal) return add(columns, null);
    for (const direction2 of distinct) {
      const list = columns.filter(({ members: [first] }) => parallel(first.direction, direction2));
      const parity = list.map(
        ({ members: [a, b] }) => `${a.box}${b ? Math.sign(cosine(a.direction, b.direction)) : ""}`
      );
      add(list, parity.join());
    }
  }
  factorise(columns, size, own, cross, eps) {
    const h = new Matrix2(size, size);
    const data = h.data;
    const count = this.operators.length;
    const addBlock = (rows, columnsOf, top, leftmost) => {
      const share = cosine(rows.direction, columnsOf.direction);
      if (share === 0) return;
      const block = rows.box === columnsOf.box ? own[rows.box] : cross.get(Math.max(rows.box, columnsOf.box) * count + Math.min(rows.box, columnsOf.box));
      if (!block) return;
      const left = this.operators[rows.box];
      const right = this.operators[columnsOf.box];
      const transposed = rows.box < columnsOf.box;
      const columnIndex = Uint32Array.from(columnsOf.points, (p) => right.freeIndex[p]);
      for (let i = 0; i < rows.points.length; i++) {
        const line = data[top + i];
        const r = left.freeIndex[rows.points[i]];
        for (let j = 0; j < columnIndex.length; j++) {
          const c = columnIndex[j];
          line[leftmost + j] += share * (transposed ? block[c * left.free.length + r] : block[r * right.free.length + c]);
        }
      }
    };
    for (const left of columns) {
      for (const right of columns) {
        for (const a of left.members) for (const b of right.members) addBlock(a, b, left.offset, right.offset);
      }
    }
    let trace = 0;
    for (let i = 0; i < size; i++) trace += data[i][i];
    const shift = eps * trace / size;
    for (let i = 0; i < size; i++) data[i][i] += shift;
    if (this.ties) for (let i = 0; i < size; i++) for (let j = 0; j < i; j++) data[j][i] = data[i][j];
    const factor = new CholeskyDecomposition2(h);
    if (!(trace > 0) || !factor.isPositiveDefinite()) {
      const boxes = new Set(columns.flatMap(({ members }) => members.map((m2) => this.operators[m2.box].box)));
      const labels = [...boxes].map((box) => box.name ?? box.id);
      throw new MorphError(
        "metric-singular",
        `The vertices in design box ${labels.map((l) => `"${l}"`).join(", ")} do not determine its control points.`,
        "Use fewer control points, a larger smoothing length, a larger box, or a larger eps.",
        { box: labels[0] }
      );
    }
    return { factor, eps: shift };
  }
  /** T' of lattice vectors (nPoints x 3 by box). */
  reduce(lattices) {
    return this.groups.map((group) => {
      const out = new Float64Array(group.size);
      for (const { members, offset } of group.columns) {
        for (const { box, direction: direction2, points } of members) {
          const lattice = lattices[box];
          for (let i = 0; i < points.length; i++) {
            const p = 3 * points[i];
            out[offset + i] += direction2[0] * lattice[p] + direction2[1] * lattice[p + 1] + direction2[2] * lattice[p + 2];
          }
        }
      }
      return out;
    });
  }
  /** T of a reduced vector: lattice displacements by box, nPoints x 3. */
  expand(reduced) {
    const lattices = this.operators.map((op) => new Float64Array(3 * op.pointCount));
    this.groups.forEach((group, g) => {
      for (const { members, offset } of group.columns) {
        for (const { box, direction: direction2, points } of members) {
          const lattice = lattices[box];
          for (let i = 0; i < points.length; i++) {
            const value = reduced[g][offset + i];
            for (let d = 0; d < 3; d++) lattice[3 * points[i] + d] += direction2[d] * value;
          }
        }
      }
    });
    return lattices;
  }
  /** H^-1 of a reduced vector. */
  solve(right) {
    return this.groups.map(
      (group, g) => Float64Array.from(group.factor.solve(Matrix2.columnVector(right[g])).to1DArray())
    );
  }
};
function dot(a, b) {
  let sum = 0;
  for (let g = 0; g < a.length; g++) for (let i = 0; i < a[g].length; i++) sum += a[g][i] * b[g][i];
  return sum;
}
function combine(factors, vectors) {
  return vectors[0].map((_, g) => {
    const out = new Float64Array(vectors[0][g].length);
    for (let k = 0; k < vectors.length; k++) {
      const f = factors[k];
      if (f === 0) continue;
      const v = vectors[k][g];
      for (let i = 0; i < out.length; i++) out[i] += f * v[i];
    }
    return out;
  });
}

// src/lib/morph/dual.ts
var SLACK = 1e-13;
var NO_INFLUENCE = 1e-24;
var DualProblem = class {
  /** @param places how many of the last constraints are places of the surface */
  constructor(constraints, gradientSolved, places = 0) {
    this.constraints = constraints;
    this.places = places;
    this.sign = constraints.map((c) => c.bound === "atMost" ? -1 : 1);
    const raw = constraints.map((c) => constraints.map((d) => dot(c.row, d.solved)));
    this.scale = raw.map((row, i) => Math.sqrt(Math.max(row[i], 0)));
    constraints.forEach((c, i) => {
      const size = dot(c.row, c.row);
      if (!(raw[i][i] > NO_INFLUENCE * size) || size === 0) {
        throw new MorphError(
          "constraint-invalid",
          `The constraint "${c.label}" does not depend on the control points that may move.`,
          "Remove it, or free control points where it acts.",
          { constraint: i }
        );
      }
    });
    this.gram = raw.map(
      (row, i) => row.map(
        (_, j) => i === j ? 1 : this.sign[i] * this.sign[j] * 0.5 * (raw[i][j] + raw[j][i]) / (this.scale[i] * this.scale[j])
      )
    );
    this.along = constraints.map((c, i) => this.sign[i] * dot(c.row, gradientSolved) / this.scale[i]);
  }
  constraints;
  places;
  sign;
  scale;
  gram;
  along;
  /**
   * Multipliers for the length factor a.
   * @param guess constraints that bound at another length factor, to begin with
   */
  solve(a, guess) {
    if (this.constraints.length === 0) return { mu: [], active: [] };
    return this.places > 0 ? this.solveMany(a, guess) : this.solveFew(a);
  }
  /** With places of the surface: many rows that nearly repeat each other, of which few bind. */
  solveMany(a, guess) {
    const slack = this.constraints.map((c, i) => -a * this.along[i] - this.sign[i] * c.change / this.scale[i]);
    const largest = Math.max(...slack.map(Math.abs));
    const { multipliers, active, conflict } = solveActiveSet({
      gram: this.gram,
      slack,
      guess,
      equality: this.constraints.map((c) => c.bound === "hold"),
      tolerance: this.constraints.map((c, i) => SLACK * largest + (c.tolerance ?? 0) / this.scale[i])
    });
    if (conflict) {
      throw new MorphError(
        "constraint-conflict",
        `The constraints ${this.labels(conflict.map((i) => this.constraints[i]))} contradict each other: no move keeps all of them.`,
        "Relax or remove one of them, or free more control points."
      );
    }
    return { mu: multipliers.map((v, i) => this.sign[i] * v / this.scale[i]), active };
  }
  labels(constraints) {
    return [...new Set(constraints.map((c) => `"${c.label}"`))].join(", ");
  }
  solveFew(a) {
    const gradient2 = this.constraints.map((c, i) => -(a * this.along[i] + this.sign[i] * c.change / this.scale[i]));
    const inequalities = this.constraints.map((_, i) => i).filter((i) => this.constraints[i].bound !== "hold");
    let x;
    let clamped;
    try {
      const result = solveQuadraticProgram({
        hessian: this.gram,
        gradient: gradient2,
        rows: inequalities.map((i) => this.constraints.map((_, j) => i === j ? 1 : 0)),
        bounds: inequalities.map(() => 0),
        equalities: 0
      });
      x = result.x;
      clamped = result.active;
    } catch (error) {
      if (!(error instanceof MorphError)) throw error;
      throw new MorphError(
        "constraint-conflict",
        `The constraints ${this.labels(this.constraints)} repeat or contradict each other inside the boxes.`,
        "Remove one of them."
      );
    }
    const active = this.constraints.map((c) => c.bound === "hold");
    inequalities.forEach((i, k) => {
      active[i] = !clamped[k] && x[i] > 0;
      if (!active[i]) x[i] = 0;
    });
    return { mu: x.map((v, i) => this.sign[i] * v / this.scale[i]), active };
  }
  /** The multipliers while exactly these constraints bind. */
  line(active) {
    const kept = this.constraints.map((_, i) => i).filter((i) => active[i]);
    const of = (right) => this.shares(kept, kept.map(right));
    return {
      base: of((i) => -(this.sign[i] * this.constraints[i].change) / this.scale[i]),
      slope: of((i) => -this.along[i])
    };
  }
  /**
   * A correction that changes one constraint's value and, to first order, none of the other active ones, shortest in
   * the metric: returns coefficients of the solved rows.
   */
  correction(index, active) {
    const kept = this.constraints.map((_, i) => i).filter((i) => i === index || active[i]);
    return this.shares(
      kept,
      kept.map((i) => i === index ? -1 : 0)
    );
  }
  /** Coefficients of the kept constraints' solved rows that minimise 1/2 x'Gx + gradient'x; 0 for the others. */
  shares(kept, gradient2) {
    const out = new Array(this.constraints.length).fill(0);
    if (kept.length === 0) return out;
    const hessian = kept.map((i) => kept.map((j) => this.gram[i][j]));
    const { x } = solveQuadraticProgram({ hessian, gradient: gradient2, rows: [], bounds: [], equalities: 0 });
    kept.forEach((i, k) => out[i] = this.sign[i] * x[k] / this.scale[i]);
    return out;
  }
  /** The move itself: -a H^-1 g + sum mu_j H^-1 c_j. */
  assemble(a, gradientSolved, mu) {
    return combine([-a, ...mu], [gradientSolved, ...this.constraints.map((c) => c.solved)]);
  }
};

// src/lib/morph/fields.ts
var GradientCache = class {
  constructor(space) {
    this.space = space;
  }
  space;
  kept = /* @__PURE__ */ new WeakMap();
  get(gradient2) {
    let prepared2 = this.kept.get(gradient2);
    if (!prepared2) {
      const row = this.space.row(gradient2);
      const solved = this.space.solve(row);
      prepared2 = { row, solved, field: this.space.field(solved) };
      this.kept.set(gradient2, prepared2);
    }
    return prepared2;
  }
};
function along(gradient2, moved, displacement) {
  let sum = 0;
  for (let i = 0; i < moved.length; i++) {
    const v = 3 * moved[i];
    sum += gradient2[v] * displacement[3 * i] + gradient2[v + 1] * displacement[3 * i + 1] + gradient2[v + 2] * displacement[3 * i + 2];
  }
  return sum;
}
function mix(factors, fields) {
  const out = new Float64Array(fields[0].length);
  for (let k = 0; k < fields.length; k++) {
    const f = factors[k];
    if (f === 0) continue;
    const field = fields[k];
    for (let i = 0; i < out.length; i++) out[i] += f * field[i];
  }
  return out;
}
function displacementNorms(displacement) {
  let max = 0;
  let sum = 0;
  for (let i = 0; i < displacement.length; i += 3) {
    const s = displacement[i] ** 2 + displacement[i + 1] ** 2 + displacement[i + 2] ** 2;
    sum += s;
    if (s > max) max = s;
  }
  const n = displacement.length / 3;
  return { max: Math.sqrt(max), rms: n > 0 ? Math.sqrt(sum / n) : 0 };
}
function checkObjectives(objectives, surface2) {
  const seen = /* @__PURE__ */ new Set();
  for (const objective of objectives) {
    const place = { objective: objective.id };
    if (seen.has(objective.id)) {
      throw new MorphError("gradient-missing", `Objective "${objective.id}" is given twice.`, "Give each once.", place);
    }
    seen.add(objective.id);
    if (!Number.isFinite(objective.weight) || objective.weight < 0) {
      throw new MorphError(
        "gradient-missing",
        `Objective "${objective.id}" has the weight ${objective.weight}.`,
        "Give a weight of 0 or more; the sense says whether it falls or rises.",
        place
      );
    }
    if (objective.gradient.length !== surface2.positions.length) {
      throw new MorphError(
        "map-shape",
        `The gradient of objective "${objective.id}" has ${objective.gradient.length} entries; the surface needs ${surface2.positions.length}.`,
        "Give three numbers per vertex of this shape.",
        place
      );
    }
    for (let i = 0; i < objective.gradient.length; i++) {
      if (!Number.isFinite(objective.gradient[i])) {
        throw new MorphError(
          "map-shape",
          `The gradient of objective "${objective.id}" is not finite at vertex ${Math.floor(i / 3)}.`,
          "Upload a map with finite values only.",
          { ...place, vertex: Math.floor(i / 3) }
        );
      }
    }
  }
}

// src/lib/morph/descent.ts
var NO_DESCENT = 1e-18;
var MAX_FITS = 80;
var ENDLESS = 1e5;
var Descent = class {
  /**
   * @param places how many of the last constraints are places of the surface
   * @param hand displacement made by hand, moved x 3, or null
   */
  constructor(space, steering, constraints, places, hand) {
    this.space = space;
    this.steering = steering;
    this.constraints = constraints;
    this.hand = hand;
    this.dual = new DualProblem(constraints, steering.solved, places);
    this.fields = [steering.field, ...constraints.map((c) => c.field)];
  }
  space;
  steering;
  constraints;
  hand;
  dual;
  fields;
  /** The surface field of coefficients of [H^-1 g, H^-1 c_1, ...]. */
  field(coefficients) {
    const known = [];
    const formed = [];
    this.fields.forEach((f, k) => (f ? known : formed).push(k));
    const out = mix(
      known.map((k) => coefficients[k]),
      known.map((k) => this.fields[k])
    );
    const rest = formed.filter((k) => coefficients[k] !== 0);
    if (rest.length === 0) return out;
    const reduced = combine(
      rest.map((k) => coefficients[k]),
      rest.map((k) => this.constraints[k - 1].solved)
    );
    const added = this.space.field(reduced);
    for (let i = 0; i < out.length; i++) out[i] += added[i];
    return out;
  }
  reduced(coefficients) {
    return combine(coefficients, [this.steering.solved, ...this.constraints.map((c) => c.solved)]);
  }
  /** Squared length in the metric. */
  squaredLength(coefficients) {
    const rows = combine(coefficients, [this.steering.row, ...this.constraints.map((c) => c.row)]);
    return Math.max(0, dot(this.reduced(coefficients), rows));
  }
  /**
   * @param step metres
   * @throws MorphError constraint-conflict, step-unreachable
   */
  fit(step) {
    if (!this.hand && this.constraints.every((c) => c.change === 0)) return this.proportional(step);
    return this.bounded(step);
  }
  /** With bounds at the present values the move is proportional to its length factor. */
  proportional(step) {
    const { mu, active } = this.dual.solve(1);
    const displacement = this.field([-1, ...mu]);
    const length = displacementNorms(displacement).max;
    const { row, solved } = this.steering;
    const left = -dot(row, this.dual.assemble(1, solved, mu));
    if (!(left > NO_DESCENT * dot(row, solved)) || !(length > 0)) throw this.stuck();
    const a = step / length;
    for (let i = 0; i < displacement.length; i++) displacement[i] *= a;
    return { a, mu: mu.map((m2) => m2 * a), active, displacement };
  }
  /**
   * While the same constraints bind, the displacement is F0 + a F1; the length factor at which its largest length is the
   * step follows vertex by vertex from a quadratic. A change of the binding constraints starts anew, within a bracket.
   */
  bounded(step) {
    const unit = displacementNorms(this.steering.field).max;
    const start = step / unit;
    let low = 0;
    let high = Infinity;
    let a = start;
    let before = "";
    let guess = this.constraints.map((c) => c.likely ?? false);
    for (let k = 0; k < MAX_FITS; k++) {
      const { active } = this.dual.solve(a, guess);
      guess = active;
      const { base, slope } = this.dual.line(active);
      const f0 = this.field([0, ...base]);
      const f1 = this.field([-1, ...slope]);
      globalThis.fits = (globalThis.fits ?? 0) + 1;
      const found = lengthFactor(f0, f1, step);
      const reach = found !== null && found <= ENDLESS * start ? found : null;
      const key = active.map(Number).join("");
      const length = longest(f0, f1, a);
      if (reach !== null && reach > 0 && (reach === a || key === before && close(reach, a) || this.same(active, reach))) {
        return this.result(reach, active, f0, f1);
      }
      before = key;
      if (length < step) low = Math.max(low, a);
      else high = Math.min(high, a);
      if (high <= low * (1 + 1e-14)) return this.result(a, active, f0, f1);
      if (high === Infinity && low > ENDLESS * start) throw this.unreachable(length, step, active);
      if (low === 0 && high < 1e-12 * start) throw this.asksTooMuch(step);
      const proposal = reach !== null && reach > low && reach < high && k % 4 !== 3 ? reach : null;
      a = proposal ?? (high === Infinity ? 8 * a : low === 0 ? high / 8 : 0.5 * (low + high));
    }
    throw this.asksTooMuch(step);
  }
  same(active, a) {
    const other = this.dual.solve(a, active).active;
    return active.every((on, i) => on === other[i]);
  }
  result(a, active, f0, f1) {
    const { base, slope } = this.dual.line(active);
    const displacement = f0;
    for (let i = 0; i < displacement.length; i++) displacement[i] += a * f1[i];
    if (this.hand) for (let i = 0; i < displacement.length; i++) displacement[i] += this.hand[i];
    return { a, mu: base.map((b, j) => b + a * slope[j]), active, displacement };
  }
  names(active) {
    const labels = this.constraints.filter((_, i) => !active || active[i]).map((c) => c.label);
    return [...new Set(labels)].map((l) => `"${l}"`).join(", ");
  }
  stuck() {
    return new MorphError(
      "constraint-conflict",
      "The constraints leave no direction in which the weighted objective falls.",
      "Relax a constraint, free more control points, or weight another objective."
    );
  }
  unreachable(length, step, active) {
    return new MorphError(
      "step-unreachable",
      `The step of ${step} m cannot be reached: with ${this.names(active)} kept, no vertex can gain by moving more than ${length.toPrecision(4)} m.`,
      `Take a step below ${length.toPrecision(3)} m, relax the constraint, or free more control points.`
    );
  }
  asksTooMuch(step) {
    const { mu } = this.dual.solve(0);
    const asked = displacementNorms(this.field([0, ...mu])).max;
    return new MorphError(
      "constraint-conflict",
      `The bounds of ${this.names()} ask for a displacement of ${asked.toPrecision(4)} m; the step is ${step} m.`,
      "Give a longer step, or bounds nearer to the present values."
    );
  }
};
var close = (a, b) => Math.abs(a - b) <= 1e-13 * Math.abs(a);
function longest(f0, f1, a) {
  let max = 0;
  for (let i = 0; i < f0.length; i += 3) {
    const s = (f0[i] + a * f1[i]) ** 2 + (f0[i + 1] + a * f1[i + 1]) ** 2 + (f0[i + 2] + a * f1[i + 2]) ** 2;
    if (s > max) max = s;
  }
  return Math.sqrt(max);
}
function lengthFactor(f0, f1, step) {
  let from = -Infinity;
  let to = Infinity;
  for (let i = 0; i < f0.length; i += 3) {
    const q = f1[i] ** 2 + f1[i + 1] ** 2 + f1[i + 2] ** 2;
    const p = f0[i] * f1[i] + f0[i + 1] * f1[i + 1] + f0[i + 2] * f1[i + 2];
    const c = f0[i] ** 2 + f0[i + 1] ** 2 + f0[i + 2] ** 2 - step * step;
    const inside = p * p - q * c;
    if (q === 0) {
      if (c > 0) return null;
      continue;
    }
    if (inside < 0) return null;
    const root = Math.sqrt(inside);
    const near = p > 0 ? -(p + root) / q : (root - p) / q;
    const other = near === 0 ? 0 : c / (q * near);
    from = Math.max(from, Math.min(near, other));
    to = Math.min(to, Math.max(near, other));
  }
  return to >= from && to < Infinity ? to : null;
}

// src/lib/morph/hand.ts
var MIRROR_TOLERANCE = 1e-6;
function handLattices(hand, given, operators, ties) {
  if (hand.length !== given) {
    throw new MorphError(
      "hand-invalid",
      `There are hand-made displacements for ${hand.length} boxes; the move has ${given}.`,
      "Give one list or null for every box of the move."
    );
  }
  const lattices = operators.map((op, b) => {
    const label = op.box.name ?? op.box.id;
    const given2 = hand[b];
    const out = new Float64Array(3 * op.pointCount);
    if (!given2) return out;
    if (given2.length !== out.length || !given2.every(Number.isFinite)) {
      throw new MorphError(
        "hand-invalid",
        `The displacement of design box "${label}" does not fit its lattice.`,
        "Give three finite numbers per control point, for every box.",
        { box: label }
      );
    }
    for (let p = 0; p < op.pointCount; p++) {
      if (op.freeIndex[p] >= 0 || given2[3 * p] === 0 && given2[3 * p + 1] === 0 && given2[3 * p + 2] === 0) continue;
      throw new MorphError(
        "hand-invalid",
        `Control point ${p} of design box "${label}" is held, and cannot be moved by hand.`,
        "Free its plane or the point itself, or leave it where it is.",
        { box: label }
      );
    }
    out.set(given2);
    return out;
  });
  for (const { box, image, points } of ties?.list ?? []) {
    if (image < 0) continue;
    const own = lattices[box];
    const other = lattices[image];
    const normal = ties.normal;
    const size = own.reduce((max, x) => Math.max(max, Math.abs(x)), 0);
    points.forEach((q, p) => {
      const mirrored = reflectVector([own[3 * p], own[3 * p + 1], own[3 * p + 2]], normal);
      if (image >= given) return other.set(mirrored, 3 * q);
      if (mirrored.every((x, d) => Math.abs(x - other[3 * q + d]) <= MIRROR_TOLERANCE * size)) return;
      const label = operators[box].box.name ?? operators[box].box.id;
      throw new MorphError(
        "hand-invalid",
        `The study is symmetric, but the hand-made displacement of design box "${label}" is not: control point ${p} and its mirror image ${q} differ.`,
        "Move both points of each mirrored pair alike, or turn the symmetry of the move off.",
        { box: label }
      );
    });
  }
  return lattices;
}

// src/lib/morph/linear-constraints.ts
var BOUNDS = ["hold", "atLeast", "atMost"];
function linearPart(constraint, index, surface2, gradients, objectives) {
  const { bound, value } = constraint;
  const place = { constraint: index };
  if (value !== void 0 && !Number.isFinite(value)) {
    throw new MorphError("constraint-invalid", `The bound ${value} is no number.`, "Give a finite bound.", place);
  }
  if (!BOUNDS.includes(bound)) {
    throw new MorphError(
      "constraint-invalid",
      `The bound "${String(bound)}" is unknown.`,
      "Give hold, atLeast or atMost.",
      place
    );
  }
  if (constraint.kind === "volume") {
    if (!surface2.watertight) {
      throw new MorphError(
        "mesh-open",
        "The surface is open, so it encloses no volume that a move could keep.",
        "Close the surface, or remove the volume constraint.",
        place
      );
    }
    const gradient3 = surface2.volumeGradient;
    const limit2 = value ?? surface2.volume;
    const change = limit2 - surface2.volume;
    return { constraint, index, prepared: gradients.get(gradient3), gradient: gradient3, limit: limit2, change, label: "volume" };
  }
  const objective = objectives.find((o) => o.id === constraint.objectiveId);
  if (!objective) {
    throw new MorphError(
      "gradient-missing",
      `The constrained objective "${constraint.objectiveId}" has no map.`,
      "Upload its map for this shape, or remove the constraint.",
      { ...place, objective: constraint.objectiveId }
    );
  }
  const { gradient: gradient2 } = objective;
  const limit = value ?? 0;
  const label = `objective ${objective.id}`;
  return { constraint, index, prepared: gradients.get(gradient2), gradient: gradient2, limit, change: limit, label };
}

// src/lib/morph/chebyshev.ts
function expandBernstein(degree, cells, order) {
  const functions = degree + 1;
  const nodes = degree + 1;
  const terms = order + 1;
  const coefficients = new Float64Array(cells * terms * functions);
  const magnitudes = new Float64Array(degree + 1);
  const samples = new Float64Array(nodes * functions);
  const cosines = new Float64Array(nodes * (degree + 1));
  for (let q = 0; q < nodes; q++) {
    for (let k = 0; k <= degree; k++) cosines[q * (degree + 1) + k] = Math.cos(Math.PI * k * (q + 0.5) / nodes);
  }
  const row = new Float64Array(functions);
  for (let s = 0; s < cells; s++) {
    for (let q = 0; q < nodes; q++) {
      const x = Math.cos(Math.PI * (q + 0.5) / nodes);
      bernstein(degree, (s + 0.5 + 0.5 * x) / cells, samples, q * functions);
    }
    for (let k = 0; k <= degree; k++) {
      row.fill(0);
      for (let q = 0; q < nodes; q++) {
        const c = cosines[q * (degree + 1) + k];
        for (let i = 0; i < functions; i++) row[i] += c * samples[q * functions + i];
      }
      const scale = (k === 0 ? 1 : 2) / nodes;
      for (let i = 0; i < functions; i++) {
        const value = row[i] * scale;
        if (k <= order) coefficients[(s * terms + k) * functions + i] = value;
        magnitudes[k] = Math.max(magnitudes[k], Math.abs(value));
      }
    }
  }
  return { cells, functions, terms, coefficients, magnitudes };
}
function truncationBound(u, v, w, order) {
  const tail = new Float64Array(w.length + 1);
  for (let c = w.length - 1; c >= 0; c--) tail[c] = tail[c + 1] + w[c];
  let sum = 0;
  for (let a = 0; a < u.length; a++) {
    for (let b = 0; b < v.length; b++) {
      const from = Math.max(0, order + 1 - a - b);
      if (from < w.length) sum += u[a] * v[b] * tail[from];
    }
  }
  return sum;
}

// src/lib/morph/cells.ts
var BLOCK = 4;
var CELL_STEPS = [1, 2, 4, 6, 8, 12, 16, 20, 24, 32, 40, 48, 64, 80, 96, 128];
var ORDERS = [4, 5, 6, 7, 8, 9];
var METRIC_TOLERANCE = 2e-9;
var FIELD_TOLERANCE = 2e-11;
function chooseCells(degrees, vertexCount) {
  const kept = /* @__PURE__ */ new Map();
  const magnitudes = (degree, cells) => {
    const key = `${degree}/${cells}`;
    let found = kept.get(key);
    if (!found) {
      found = expandBernstein(degree, cells, 0).magnitudes;
      kept.set(key, found);
    }
    return found;
  };
  const meets = (factor, cells, order, tolerance) => {
    const [u, v, w] = degrees.map((d, k) => magnitudes(factor * d, cells[k]));
    return truncationBound(u, v, w, order) <= tolerance;
  };
  const top = Math.max(...degrees);
  let best = null;
  let bestCost = Infinity;
  for (const order of ORDERS) {
    for (const step of CELL_STEPS) {
      const cells = degrees.map((d) => Math.max(1, Math.ceil(step * d / top)));
      if (!meets(1, cells, order, FIELD_TOLERANCE) || !meets(2, cells, order, METRIC_TOLERANCE)) continue;
      const terms = (order + 1) * (order + 2) * (order + 3) / 6;
      const pairs = (order + 1) * (order + 2) / 2;
      const [fu, fv, fw] = degrees.map((d) => 2 * d + 1);
      const columns = Math.min(vertexCount, cells[0] * cells[1]);
      const occupied = Math.min(vertexCount, 3 * Math.max(columns, cells[0] * cells[2], cells[1] * cells[2]));
      const cost = 6 * (vertexCount * terms + occupied * terms * fw + columns * pairs * fv * fw + cells[0] * (order + 1) * fu * fv * fw);
      if (cost < bestCost) {
        bestCost = cost;
        best = { cells, order };
      }
      break;
    }
  }
  return best;
}
function makeCellGrid(uvw, cells, order) {
  const n = uvw.length / 3;
  const [cu, cv, cw] = cells;
  const key = new Uint32Array(n);
  const counts = new Uint32Array(cu * cv * cw + 1);
  for (let i = 0; i < n; i++) {
    const a = Math.min(cu - 1, Math.floor(uvw[3 * i] * cu));
    const b = Math.min(cv - 1, Math.floor(uvw[3 * i + 1] * cv));
    const c = Math.min(cw - 1, Math.floor(uvw[3 * i + 2] * cw));
    key[i] = (a * cv + b) * cw + c;
    counts[key[i] + 1]++;
  }
  let occupied = 0;
  for (let k = 0; k < counts.length - 1; k++) if (counts[k + 1] > 0) occupied++;
  const starts = new Uint32Array(occupied + 1);
  const keys = new Uint32Array(occupied);
  let o = 0;
  for (let k = 0; k < counts.length - 1; k++) {
    const here = counts[k + 1];
    counts[k + 1] += counts[k];
    if (here > 0) {
      keys[o] = k;
      starts[o] = counts[k];
      o++;
    }
  }
  starts[occupied] = n;
  const sorted = new Uint32Array(n);
  const local = new Float64Array(3 * n);
  for (let i = 0; i < n; i++) {
    const at = counts[key[i]]++;
    sorted[at] = i;
    const c = key[i] % cw;
    const rest = (key[i] - c) / cw;
    const b = rest % cv;
    const a = (rest - b) / cv;
    local[3 * at] = 2 * (uvw[3 * i] * cu - a) - 1;
    local[3 * at + 1] = 2 * (uvw[3 * i + 1] * cv - b) - 1;
    local[3 * at + 2] = 2 * (uvw[3 * i + 2] * cw - c) - 1;
  }
  return { cells, order, terms: (order + 1) * (order + 2) * (order + 3) / 6, sorted, local, starts, keys };
}
function gridExpansions(grid, degrees) {
  const of = (axis) => expandBernstein(degrees[axis], grid.cells[axis], grid.order);
  return [of(0), of(1), of(2)];
}
function termLayout(order) {
  const pairs = (order + 1) * (order + 2) / 2;
  const pairA = new Uint8Array(pairs);
  const pairB = new Uint8Array(pairs);
  const slot = new Uint8Array(pairs);
  for (let total = 0, l = 0; total <= order; total++) {
    for (let b = 0; b <= total; b++, l++) {
      const a = total - b;
      pairA[l] = a;
      pairB[l] = b;
      slot[l] = a * (order + 1) - a * (a - 1) / 2 + b;
    }
  }
  const counts = Uint32Array.from({ length: order + 1 }, (_, c) => (order - c + 1) * (order - c + 2) / 2);
  const offsets = new Uint32Array(order + 1);
  for (let c = 1; c <= order; c++) offsets[c] = offsets[c - 1] + counts[c - 1];
  return { order, terms: offsets[order] + counts[order], pairA, pairB, slot, counts, offsets };
}
function termValues(layout, x, y, z, tx, ty, out) {
  const { order, pairA, pairB, counts, offsets } = layout;
  tx[0] = ty[0] = 1;
  tx[1] = x;
  ty[1] = y;
  const x2 = 2 * x;
  const y2 = 2 * y;
  const z2 = 2 * z;
  for (let k = 2; k <= order; k++) {
    tx[k] = x2 * tx[k - 1] - tx[k - 2];
    ty[k] = y2 * ty[k - 1] - ty[k - 2];
  }
  const pairs = counts[0];
  for (let l = 0; l < pairs; l++) out[l] = tx[pairA[l]] * ty[pairB[l]];
  const second = order > 0 ? counts[1] : 0;
  for (let l = 0; l < second; l++) out[pairs + l] = z * out[l];
  for (let c = 2; c <= order; c++) {
    const at = offsets[c];
    const before = offsets[c - 1];
    const twice = offsets[c - 2];
    const count = counts[c];
    for (let l = 0; l < count; l++) out[at + l] = z2 * out[before + l] - out[twice + l];
  }
}
function makeScratch(order, terms) {
  return {
    phi: Array.from({ length: BLOCK }, () => new Float64Array(terms)),
    tx: new Float64Array(order + 2),
    ty: new Float64Array(order + 2)
  };
}
function spread(target, to, coefficients, at, count, source, from, stride, terms, length) {
  for (let t2 = 0; t2 < terms; t2 += 3) {
    const t1 = t2 + 1 < terms ? t2 + 1 : t2;
    const t22 = t2 + 2 < terms ? t2 + 2 : t2;
    const on1 = t2 + 1 < terms ? 1 : 0;
    const on2 = t2 + 2 < terms ? 1 : 0;
    const s0 = from + t2 * stride;
    const s1 = from + t1 * stride;
    const s2 = from + t22 * stride;
    for (let i = 0; i < count; i++) {
      const f0 = coefficients[at + t2 * count + i];
      const f1 = coefficients[at + t1 * count + i] * on1;
      const f2 = coefficients[at + t22 * count + i] * on2;
      const base = to + i * length;
      for (let k = 0; k < length; k++) {
        target[base + k] += f0 * source[s0 + k] + f1 * source[s1 + k] + f2 * source[s2 + k];
      }
    }
  }
}
function gatherBlock(cell2, base, terms, phi, weights, i0, i1, i2, i3, present) {
  const on1 = present > 1 ? 1 : 0;
  const on2 = present > 2 ? 1 : 0;
  const on3 = present > 3 ? 1 : 0;
  const a0 = weights[i0];
  const b0 = weights[i0 + 1];
  const d0 = weights[i0 + 2];
  const a1 = weights[i1] * on1;
  const b1 = weights[i1 + 1] * on1;
  const d1 = weights[i1 + 2] * on1;
  const a2 = weights[i2] * on2;
  const b2 = weights[i2 + 1] * on2;
  const d2 = weights[i2 + 2] * on2;
  const a3 = weights[i3] * on3;
  const b3 = weights[i3 + 1] * on3;
  const d3 = weights[i3 + 2] * on3;
  const phi0 = phi[0];
  const phi1 = phi[1];
  const phi2 = phi[2];
  const phi3 = phi[3];
  for (let l = 0, m2 = base; l < terms; l++, m2 += 3) {
    const p0 = phi0[l];
    const p1 = phi1[l];
    const p2 = phi2[l];
    const p3 = phi3[l];
    cell2[m2] += a0 * p0 + a1 * p1 + a2 * p2 + a3 * p3;
    cell2[m2 + 1] += b0 * p0 + b1 * p1 + b2 * p2 + b3 * p3;
    cell2[m2 + 2] += d0 * p0 + d1 * p1 + d2 * p2 + d3 * p3;
  }
}
function spreadCell(layout, column, columnStart, columnStride, cell2, cellStart, coefficients, coefficientStart, functions) {
  const { order, slot, counts } = layout;
  let m2 = cellStart;
  for (let c = 0; c <= order; c++) {
    const from = coefficientStart + c * functions;
    const count = counts[c];
    for (let l = 0; l < count; l++, m2 += 3) {
      const m0 = cell2[m2];
      const m1 = cell2[m2 + 1];
      const m22 = cell2[m2 + 2];
      for (let k = 0, at = columnStart + slot[l] * columnStride; k < functions; k++, at += 3) {
        const f = coefficients[from + k];
        column[at] += m0 * f;
        column[at + 1] += m1 * f;
        column[at + 2] += m22 * f;
      }
    }
  }
}
function cellMoments(grid, weights, sets, expansions, checkpoint) {
  const [eu, ev, ew] = expansions;
  const { order, terms, sorted, local, starts, keys } = grid;
  const [, cv, cw] = grid.cells;
  const nu = eu.functions;
  const nv = ev.functions;
  const nw = ew.functions;
  const size = order + 1;
  const pairs = size * (size + 1) / 2;
  const groups = sets / 3;
  const row = 3 * nw;
  const plane = nv * row;
  const out = new Float64Array(groups * nu * plane);
  const cell2 = new Float64Array(terms * sets);
  const column = new Float64Array(pairs * groups * row);
  const slab = new Float64Array(size * groups * plane);
  const layout = termLayout(order);
  const { phi, tx, ty } = makeScratch(order, terms);
  for (let o = 0; o < keys.length; o++) {
    const key = keys[o];
    const c0 = key % cw;
    cell2.fill(0);
    const last = starts[o + 1];
    for (let i = starts[o]; i < last; i += BLOCK) {
      const here = Math.min(BLOCK, last - i);
      for (let q = 0; q < here; q++) {
        const at = 3 * (i + q);
        termValues(layout, local[at], local[at + 1], local[at + 2], tx, ty, phi[q]);
      }
      const i0 = sets * sorted[i];
      const i1 = here > 1 ? sets * sorted[i + 1] : i0;
      const i2 = here > 2 ? sets * sorted[i + 2] : i0;
      const i3 = here > 3 ? sets * sorted[i + 3] : i0;
      for (let s = 0; s < sets; s += 3) {
        gatherBlock(cell2, s * terms, terms, phi, weights, i0 + s, i1 + s, i2 + s, i3 + s, here);
      }
    }
    for (let g = 0; g < groups; g++) {
      spreadCell(layout, column, g * row, groups * row, cell2, 3 * g * terms, ew.coefficients, c0 * size * nw, nw);
    }
    const line = (key - c0) / cw;
    const nextLine = o + 1 < keys.length ? Math.floor(keys[o + 1] / cw) : -1;
    if (nextLine === line) continue;
    const b0 = line % cv;
    const a0 = (line - b0) / cv;
    for (let a = 0, ab = 0; a < size; ab += size - a, a++) {
      for (let g = 0; g < groups; g++) {
        const to = (a * groups + g) * plane;
        const from = (ab * groups + g) * row;
        spread(slab, to, ev.coefficients, b0 * size * nv, nv, column, from, groups * row, size - a, row);
      }
    }
    column.fill(0);
    if (nextLine >= 0 && Math.floor(nextLine / cv) === a0) continue;
    for (let g = 0; g < groups; g++) {
      const stride = groups * plane;
      spread(out, g * nu * plane, eu.coefficients, a0 * size * nu, nu, slab, g * plane, stride, size, plane);
    }
    slab.fill(0);
    checkpoint?.((o + 1) / keys.length);
  }
  return out;
}
function collect(target, to, coefficients, at, count, source, from, length) {
  for (let i = 0; i < count; i++) {
    const f = coefficients[at + i];
    const base = from + i * length;
    for (let k = 0; k < length; k++) target[to + k] += f * source[base + k];
  }
}
function collectCell(layout, cell2, column, columnStride, coefficients, coefficientStart, functions) {
  const { order, slot, counts } = layout;
  let m2 = 0;
  for (let c = 0; c <= order; c++) {
    const from = coefficientStart + c * functions;
    const count = counts[c];
    for (let l = 0; l < count; l++, m2 += 3) {
      let x = 0;
      let y = 0;
      let z = 0;
      for (let k = 0, at = slot[l] * columnStride; k < functions; k++, at += 3) {
        const f = coefficients[from + k];
        x += f * column[at];
        y += f * column[at + 1];
        z += f * column[at + 2];
      }
      cell2[m2] = x;
      cell2[m2 + 1] = y;
      cell2[m2 + 2] = z;
    }
  }
}
function valueAt(out, at, phi, cell2, terms) {
  let x = 0;
  let y = 0;
  let z = 0;
  for (let l = 0, m2 = 0; l < terms; l++, m2 += 3) {
    const p = phi[l];
    x += p * cell2[m2];
    y += p * cell2[m2 + 1];
    z += p * cell2[m2 + 2];
  }
  out[at] = x;
  out[at + 1] = y;
  out[at + 2] = z;
}
function cellValues(grid, lattice, expansions) {
  const [eu, ev, ew] = expansions;
  const { order, terms, sorted, local, starts, keys } = grid;
  const [, cv, cw] = grid.cells;
  const nu = eu.functions;
  const nv = ev.functions;
  const nw = ew.functions;
  const size = order + 1;
  const pairs = size * (size + 1) / 2;
  const row = 3 * nw;
  const plane = nv * row;
  const out = new Float64Array(3 * sorted.length);
  const slab = new Float64Array(size * plane);
  const column = new Float64Array(pairs * row);
  const cell2 = new Float64Array(3 * terms);
  const layout = termLayout(order);
  const { phi, tx, ty } = makeScratch(order, terms);
  let columnKey = -1;
  let slabKey = -1;
  for (let o = 0; o < keys.length; o++) {
    const c0 = keys[o] % cw;
    const line = (keys[o] - c0) / cw;
    if (line !== columnKey) {
      columnKey = line;
      const b0 = line % cv;
      const a0 = (line - b0) / cv;
      if (a0 !== slabKey) {
        slabKey = a0;
        slab.fill(0);
        for (let a = 0; a < size; a++) {
          collect(slab, a * plane, eu.coefficients, (a0 * size + a) * nu, nu, lattice, 0, plane);
        }
      }
      column.fill(0);
      for (let a = 0, ab = 0; a < size; a++) {
        for (let b = 0; b < size - a; b++, ab++) {
          collect(column, ab * row, ev.coefficients, (b0 * size + b) * nv, nv, slab, a * plane, row);
        }
      }
    }
    collectCell(layout, cell2, column, row, ew.coefficients, c0 * size * nw, nw);
    for (let i = starts[o]; i < starts[o + 1]; i++) {
      termValues(layout, local[3 * i], local[3 * i + 1], local[3 * i + 2], tx, ty, phi[0]);
      valueAt(out, 3 * sorted[i], phi[0], cell2, terms);
    }
  }
  return out;
}

// src/lib/morph/metric.ts
function binomials(n) {
  const row = new Float64Array(n + 1);
  row[0] = 1;
  for (let i = 1; i <= n; i++) row[i] = row[i - 1] * (n - i + 1) / i;
  return row;
}
function elevate(coefficients) {
  const m2 = coefficients.length - 1;
  const out = new Float64Array(m2 + 2);
  for (let i = 0; i <= m2 + 1; i++) {
    if (i > 0) out[i] += i / (m2 + 1) * coefficients[i - 1];
    if (i <= m2) out[i] += (1 - i / (m2 + 1)) * coefficients[i];
  }
  return out;
}
function productTables(degree, scale) {
  const n = degree;
  const count = n + 1;
  const functions = 2 * n + 1;
  const full = binomials(n);
  const low = binomials(n - 1);
  const tables = {
    count,
    functions,
    values: new Float64Array(count * count * functions),
    slopeValue: new Float64Array(count * count * functions),
    valueSlope: new Float64Array(count * count * functions),
    slopes: new Float64Array(count * count * functions)
  };
  const of2n = binomials(2 * n);
  const of2n1 = binomials(2 * n - 1);
  const of2n2 = binomials(2 * n - 2);
  const slope = (i) => {
    const parts = [];
    if (i > 0) parts.push([i - 1, n * scale]);
    if (i < n) parts.push([i, -n * scale]);
    return parts;
  };
  for (let i = 0; i < count; i++) {
    for (let j = 0; j < count; j++) {
      const at = (i * count + j) * functions;
      const mirrored = (j * count + i) * functions;
      tables.values[at + i + j] = full[i] * full[j] / of2n[i + j];
      const once = new Float64Array(2 * n);
      for (const [p, f] of slope(i)) once[p + j] += f * low[p] * full[j] / of2n1[p + j];
      const raised = elevate(once);
      tables.slopeValue.set(raised, at);
      tables.valueSlope.set(raised, mirrored);
      const twice = new Float64Array(2 * n - 1);
      for (const [p, f] of slope(i)) {
        for (const [q, g] of slope(j)) twice[p + q] += f * g * low[p] * low[q] / of2n2[p + q];
      }
      tables.slopes.set(elevate(elevate(twice)), at);
    }
  }
  return tables;
}
var UU = 0;
var VV = 1;
var WW = 2;
var UV = 3;
var UW = 4;
var VW = 5;
function metricFromMoments(moments, tables, smoothing, freeIndex, free) {
  const [tu, tv, tw] = tables;
  const fu = tu.functions;
  const fv = tv.functions;
  const fw = tw.functions;
  const volume = fu * fv * fw;
  const r2 = smoothing * smoothing;
  const set = (k) => {
    const from = 3 * volume * Math.floor(k / 3) + k % 3;
    return Float64Array.from({ length: volume }, (_, i) => moments[from + 3 * i]);
  };
  const [suu, svv, sww, suv, suw, svw] = [UU, VV, WW, UV, UW, VW].map(set);
  const mass = new Float64Array(volume);
  for (let i = 0; i < volume; i++) mass[i] = (suu[i] + svv[i] + sww[i]) / 2;
  const out = new Float64Array(free * free);
  const plane = fu * fv;
  const alongW = Array.from({ length: 9 }, () => new Float64Array(plane));
  const [m00, uu00, vv00, uv00, ww11, uw01, uw10, vw01, vw10] = alongW;
  const x00 = new Float64Array(fu);
  const x11 = new Float64Array(fu);
  const x10 = new Float64Array(fu);
  const x01 = new Float64Array(fu);
  const contract = (source, table, at, from, to, target) => {
    for (let pq = 0; pq < plane; pq++) {
      let sum = 0;
      const base = pq * fw;
      for (let r = from; r <= to; r++) sum += table[at + r] * source[base + r];
      target[pq] = sum;
    }
  };
  for (let k = 0; k < tw.count; k++) {
    for (let l = 0; l < tw.count; l++) {
      const at = (k * tw.count + l) * fw;
      const r0 = k + l;
      const r1 = Math.max(0, r0 - 1);
      const r2low = Math.max(0, r0 - 2);
      const r1high = Math.min(fw - 1, r0 + 1);
      const r2high = Math.min(fw - 1, r0 + 2);
      contract(mass, tw.values, at, r0, r0, m00);
      if (r2 > 0) {
        contract(suu, tw.values, at, r0, r0, uu00);
        contract(svv, tw.values, at, r0, r0, vv00);
        contract(suv, tw.values, at, r0, r0, uv00);
        contract(sww, tw.slopes, at, r2low, r2high, ww11);
        contract(suw, tw.valueSlope, at, r1, r1high, uw01);
        contract(suw, tw.slopeValue, at, r1, r1high, uw10);
        contract(svw, tw.valueSlope, at, r1, r1high, vw01);
        contract(svw, tw.slopeValue, at, r1, r1high, vw10);
      }
      for (let i = 0; i < tv.count; i++) {
        for (let j = 0; j < tv.count; j++) {
          const row = (i * tv.count + j) * fv;
          const q0 = i + j;
          const q2low = Math.max(0, q0 - 2);
          const q2high = Math.min(fv - 1, q0 + 2);
          for (let p = 0; p < fu; p++) {
            const base = p * fv;
            const c00 = tv.values[row + q0];
            let a00 = c00 * m00[base + q0];
            if (r2 > 0) {
              a00 += r2 * c00 * ww11[base + q0];
              let a10 = c00 * uw01[base + q0];
              let a01 = c00 * uw10[base + q0];
              let energy = 0;
              for (let q = q2low; q <= q2high; q++) {
                const s10 = tv.slopeValue[row + q];
                const s01 = tv.valueSlope[row + q];
                energy += tv.slopes[row + q] * vv00[base + q] + s10 * vw01[base + q] + s01 * vw10[base + q];
                a10 += s01 * uv00[base + q];
                a01 += s10 * uv00[base + q];
              }
              a00 += r2 * energy;
              x11[p] = r2 * c00 * uu00[base + q0];
              x10[p] = r2 * a10;
              x01[p] = r2 * a01;
            }
            x00[p] = a00;
          }
          for (let a = 0; a < tu.count; a++) {
            const left = freeIndex[(a * tv.count + i) * tw.count + k];
            if (left < 0) continue;
            for (let b = 0; b < tu.count; b++) {
              const right = freeIndex[(b * tv.count + j) * tw.count + l];
              if (right < 0 || right > left) continue;
              const line = (a * tu.count + b) * fu;
              const p0 = a + b;
              let sum = tu.values[line + p0] * x00[p0];
              if (r2 > 0) {
                const high = Math.min(fu - 1, p0 + 2);
                for (let p = Math.max(0, p0 - 2); p <= high; p++) {
                  sum += tu.slopes[line + p] * x11[p] + tu.slopeValue[line + p] * x10[p] + tu.valueSlope[line + p] * x01[p];
                }
              }
              out[left * free + right] = sum;
            }
          }
        }
      }
    }
  }
  for (let a = 0; a < free; a++) for (let b = 0; b < a; b++) out[b * free + a] = out[a * free + b];
  return out;
}

// src/lib/morph/operator.ts
var CELL_COST_PER_VERTEX = 2500;
var CELL_COST_FIXED = 2e7;
var BoxOperator = class {
  constructor(box, surface2, weights, path) {
    this.box = box;
    const { inside, uvw } = embed(surface2.positions, box);
    this.inside = inside;
    this.uvw = uvw;
    this.bases = boxBases(box);
    this.axes = boxAxes(box);
    this.free = freePoints(box);
    this.pointCount = box.lattice[0] * box.lattice[1] * box.lattice[2];
    this.freeIndex = new Int32Array(this.pointCount).fill(-1);
    this.free.forEach((p, i) => this.freeIndex[p] = i);
    this.weights = weights ? Float64Array.from(inside, (v) => weights[v]) : null;
    let chosen = null;
    if (box.basis === "bernstein" && path !== "direct") {
      const direct = inside.length * this.free.length * this.free.length * 1.5;
      if (path === "moments" || direct > inside.length * CELL_COST_PER_VERTEX + CELL_COST_FIXED) {
        chosen = chooseCells([box.lattice[0] - 1, box.lattice[1] - 1, box.lattice[2] - 1], inside.length);
      }
    }
    this.grid = chosen ? makeCellGrid(uvw, chosen.cells, chosen.order) : null;
    this.path = this.grid ? "moments" : "direct";
  }
  box;
  inside;
  path;
  /** Held points are left out: row of each control point in the metric, -1 when held. */
  freeIndex;
  free;
  pointCount;
  axes;
  bases;
  uvw;
  weights;
  grid;
  degrees(factor) {
    const [nu, nv, nw] = this.box.lattice;
    return [factor * (nu - 1), factor * (nv - 1), factor * (nw - 1)];
  }
  /**
   * B' W f for a vector field on the surface.
   * @param field N x 3, borrowed
   * @returns nPoints x 3
   */
  project(field) {
    const { inside, weights } = this;
    const n = inside.length;
    const local = new Float64Array(3 * n);
    for (let i = 0; i < n; i++) {
      const w = weights ? weights[i] : 1;
      const v = 3 * inside[i];
      local[3 * i] = w * field[v];
      local[3 * i + 1] = w * field[v + 1];
      local[3 * i + 2] = w * field[v + 2];
    }
    if (this.grid) {
      return cellMoments(this.grid, local, 3, gridExpansions(this.grid, this.degrees(1)));
    }
    const out = new Float64Array(3 * this.pointCount);
    this.eachVertex((i, u, v, w) => {
      const x = local[3 * i];
      const y = local[3 * i + 1];
      const z = local[3 * i + 2];
      this.eachPoint(u, v, w, (p, value) => {
        out[3 * p] += value * x;
        out[3 * p + 1] += value * y;
        out[3 * p + 2] += value * z;
      });
    });
    return out;
  }
  /**
   * W B q.
   * @param lattice nPoints x 3, borrowed
   * @returns inside.length x 3
   */
  evaluate(lattice) {
    let out;
    if (this.grid) {
      out = cellValues(this.grid, lattice, gridExpansions(this.grid, this.degrees(1)));
    } else {
      out = new Float64Array(3 * this.inside.length);
      this.eachVertex((i, u, v, w) => {
        let x = 0;
        let y = 0;
        let z = 0;
        this.eachPoint(u, v, w, (p, value) => {
          x += value * lattice[3 * p];
          y += value * lattice[3 * p + 1];
          z += value * lattice[3 * p + 2];
        });
        out[3 * i] = x;
        out[3 * i + 1] = y;
        out[3 * i + 2] = z;
      });
    }
    if (this.weights) for (let i = 0; i < out.length; i++) out[i] *= this.weights[Math.floor(i / 3)];
    return out;
  }
  /**
   * Adds B' W f for a field that is `vector` at one vertex and zero elsewhere; nothing when the vertex lies outside.
   * @param lattice nPoints x 3, added to
   */
  projectVertex(vertex, x, y, z, lattice) {
    const i = indexOf(this.inside, vertex);
    if (i < 0) return;
    const factor = this.weights ? this.weights[i] : 1;
    const [u, v, w] = this.bases.map((basis, d) => {
      const values = new Float64Array(basis.count);
      evaluateBasis(basis, this.uvw[3 * i + d], values, new Float64Array(basis.count));
      return values;
    });
    this.eachPoint(u, v, w, (p, value) => {
      lattice[3 * p] += factor * value * x;
      lattice[3 * p + 1] += factor * value * y;
      lattice[3 * p + 2] += factor * value * z;
    });
  }
  /** Values (and slopes) of the three bases at each vertex inside. */
  eachVertex(visit) {
    const [bu, bv, bw] = this.bases;
    const u = new Float64Array(bu.count);
    const v = new Float64Array(bv.count);
    const w = new Float64Array(bw.count);
    const slopes = [new Float64Array(bu.count), new Float64Array(bv.count), new Float64Array(bw.count)];
    for (let i = 0; i < this.inside.length; i++) {
      evaluateBasis(bu, this.uvw[3 * i], u, slopes[0]);
      evaluateBasis(bv, this.uvw[3 * i + 1], v, slopes[1]);
      evaluateBasis(bw, this.uvw[3 * i + 2], w, slopes[2]);
      visit(i, u, v, w, slopes);
    }
  }
  eachPoint(u, v, w, visit) {
    for (let i = 0, p = 0; i < u.length; i++) {
      if (u[i] === 0) {
        p += v.length * w.length;
        continue;
      }
      for (let j = 0; j < v.length; j++) {
        const f = u[i] * v[j];
        if (f === 0) {
          p += w.length;
          continue;
        }
        for (let k = 0; k < w.length; k++, p++) if (w[k] !== 0) visit(p, f * w[k]);
      }
    }
  }
  /** M + r^2 K on the free points, free x free. */
  metric(surface2, smoothing, checkpoint) {
    return this.grid ? this.momentMetric(surface2, smoothing, checkpoint) : this.directMetric(surface2, smoothing, checkpoint);
  }
  momentMetric(surface2, smoothing, checkpoint) {
    const { inside, axes, weights } = this;
    const n = inside.length;
    const sets = new Float64Array(6 * n);
    const [a0, a1, a2, b0, b1, b2, c0, c1, c2] = axes;
    for (let i = 0; i < n; i++) {
      const id = inside[i];
      const w = weights ? weights[i] : 1;
      const m2 = surface2.mass[id] * w * w;
      const x = surface2.normals[3 * id];
      const y = surface2.normals[3 * id + 1];
      const z = surface2.normals[3 * id + 2];
      const nu = x * a0 + y * a1 + z * a2;
      const nv = x * b0 + y * b1 + z * b2;
      const nw = x * c0 + y * c1 + z * c2;
      sets[6 * i + UU] = m2 * (nv * nv + nw * nw);
      sets[6 * i + VV] = m2 * (nu * nu + nw * nw);
      sets[6 * i + WW] = m2 * (nu * nu + nv * nv);
      sets[6 * i + UV] = -m2 * nu * nv;
      sets[6 * i + UW] = -m2 * nu * nw;
      sets[6 * i + VW] = -m2 * nv * nw;
    }
    const grid = this.grid;
    const moments = cellMoments(grid, sets, 6, gridExpansions(grid, this.degrees(2)), checkpoint);
    const tables = this.box.lattice.map((count, d) => productTables(count - 1, 1 / (2 * this.box.halfSize[d])));
    return metricFromMoments(
      moments,
      tables,
      smoothing,
      this.freeIndex,
      this.free.length
    );
  }
  directMetric(surface2, smoothing, checkpoint) {
    const size = this.free.length;
    const out = new Float64Array(size * size);
    const every = Math.max(1, Math.floor(2e7 / (size * size)));
    this.eachRow(surface2, smoothing, null, (i, rows, index, used) => {
      for (let a = 0; a < used; a++) {
        const p = rows[0][a];
        const q = rows[1][a];
        const s = rows[2][a];
        const line = index[a] * size;
        if (smoothing > 0) {
          for (let b = 0; b <= a; b++) out[line + index[b]] += p * rows[0][b] + q * rows[1][b] + s * rows[2][b];
        } else for (let b = 0; b <= a; b++) out[line + index[b]] += p * rows[0][b];
      }
      if (i % every === 0) checkpoint?.(i / this.inside.length);
    });
    for (let a = 0; a < size; a++) for (let b = 0; b < a; b++) out[b * size + a] = out[a * size + b];
    return out;
  }
  /**
   * The metric between this box's free points and another's, over the vertices in both.
   * @param both vertex ids in both boxes, ascending
   * @returns this.free x other.free
   */
  crossMetric(other, both, surface2, smoothing) {
    const size = other.free.length;
    const out = new Float64Array(this.free.length * size);
    const batch = 512;
    for (let first = 0; first < both.length; first += batch) {
      const ids = both.subarray(first, Math.min(both.length, first + batch));
      const kept = [];
      other.eachRow(surface2, smoothing, ids, (_, rows, index, used) => {
        kept.push({ rows: rows.map((r) => r.slice(0, used)), index: index.slice(0, used) });
      });
      let at = 0;
      this.eachRow(surface2, smoothing, ids, (_, rows, index, used) => {
        const right = kept[at++];
        for (let a = 0; a < used; a++) {
          const line = index[a] * size;
          for (let b = 0; b < right.index.length; b++) {
            out[line + right.index[b]] += rows[0][a] * right.rows[0][b] + rows[1][a] * right.rows[1][b] + rows[2][a] * right.rows[2][b];
          }
        }
      });
    }
    return out;
  }
  /**
   * For each vertex: sqrt(m) W B and r sqrt(m) W times the slopes of B along two tangents, on the free points with
   * nonzero basis. (I - n n' = t1 t1' + t2 t2'.)
   */
  eachRow(surface2, smoothing, only, visit) {
    const rows = [
      new Float64Array(this.free.length),
      new Float64Array(this.free.length),
      new Float64Array(this.free.length)
    ];
    const index = new Int32Array(this.free.length);
    const [nu, nv, nw] = this.box.lattice;
    const { axes } = this;
    const scale = this.box.halfSize.map((h) => 1 / (2 * h));
    const [bu, bv, bw] = this.bases;
    const u = new Float64Array(nu);
    const v = new Float64Array(nv);
    const w = new Float64Array(nw);
    const su = new Float64Array(nu);
    const sv = new Float64Array(nv);
    const sw = new Float64Array(nw);
    const t2 = new Float64Array(6);
    let cursor = 0;
    for (let at = 0; at < (only ? only.length : this.inside.length); at++) {
      let i = at;
      if (only) {
        while (this.inside[cursor] < only[at]) cursor++;
        i = cursor;
      }
      const id = this.inside[i];
      const root = Math.sqrt(surface2.mass[id]) * (this.weights ? this.weights[i] : 1);
      evaluateBasis(bu, this.uvw[3 * i], u, su);
      evaluateBasis(bv, this.uvw[3 * i + 1], v, sv);
      evaluateBasis(bw, this.uvw[3 * i + 2], w, sw);
      tangents(surface2.normals, id, t2);
      const r = smoothing * root;
      const f = [0, 1].map(
        (k) => [0, 1, 2].map(
          (d) => r * scale[d] * (t2[3 * k] * axes[3 * d] + t2[3 * k + 1] * axes[3 * d + 1] + t2[3 * k + 2] * axes[3 * d + 2])
        )
      );
      const [f0, f1, f2] = f[0];
      const [g0, g1, g2] = f[1];
      let used = 0;
      for (let a = 0; a < nu; a++) {
        if (u[a] === 0 && su[a] === 0) continue;
        for (let b = 0; b < nv; b++) {
          if (v[b] === 0 && sv[b] === 0) continue;
          const uv = u[a] * v[b];
          const s0 = su[a] * v[b];
          const s1 = u[a] * sv[b];
          const left = f0 * s0 + f1 * s1;
          const right = g0 * s0 + g1 * s1;
          for (let c = 0; c < nw; c++) {
            const row = this.freeIndex[(a * nv + b) * nw + c];
            if (row < 0) continue;
            rows[0][used] = root * uv * w[c];
            rows[1][used] = left * w[c] + f2 * uv * sw[c];
            rows[2][used] = right * w[c] + g2 * uv * sw[c];
            index[used] = row;
            used++;
          }
        }
      }
      visit(i, rows, index, used);
    }
  }
};
function indexOf(list, value) {
  let low = 0;
  let high = list.length - 1;
  while (low <= high) {
    const middle = low + high >> 1;
    if (list[middle] === value) return middle;
    if (list[middle] < value) low = middle + 1;
    else high = middle - 1;
  }
  return -1;
}
function tangents(normals, v, out) {
  const x = normals[3 * v];
  const y = normals[3 * v + 1];
  const z = normals[3 * v + 2];
  const sign = z >= 0 ? 1 : -1;
  const a = -1 / (sign + z);
  const b = x * y * a;
  out[0] = 1 + sign * x * x * a;
  out[1] = sign * b;
  out[2] = -sign * x;
  out[3] = b;
  out[4] = sign + y * y * a;
  out[5] = -y;
}

// src/lib/morph/places.ts
var ADDED_PER_ROUND = 24;
var FLOAT32_ULP = 12e-8;
var GUARD_OF_STEP = 1e-6;
var IDLE_ROUNDS = 12;
var intersect2 = (moved, wanted) => {
  if (!wanted) return moved;
  const set = new Set(wanted);
  return moved.filter((v) => set.has(v));
};
var NormalDisplacement = class {
  constructor(surface2, vertices, sign, limit) {
    this.surface = surface2;
    this.vertices = vertices;
    this.sign = sign;
    this.limit = limit;
  }
  surface;
  vertices;
  sign;
  limit;
  rows(positions, within) {
    const { positions: rest, normals } = this.surface;
    const all = new Float64Array(this.vertices.length);
    let count = 0;
    this.vertices.forEach((v, i) => {
      let value = 0;
      for (let d = 0; d < 3; d++) value += (positions[3 * v + d] - rest[3 * v + d]) * normals[3 * v + d];
      all[i] = this.sign * value;
      if (all[i] + this.limit < within) count++;
    });
    const rows = {
      count,
      starts: Uint32Array.from({ length: count + 1 }, (_, k2) => k2),
      vertices: new Uint32Array(count),
      vectors: new Float64Array(3 * count),
      slack: new Float64Array(count),
      values: new Float64Array(count)
    };
    let k = 0;
    this.vertices.forEach((v, i) => {
      if (!(all[i] + this.limit < within)) return;
      rows.vertices[k] = v;
      for (let d = 0; d < 3; d++) rows.vectors[3 * k + d] = this.sign * normals[3 * v + d];
      rows.slack[k] = all[i] + this.limit;
      rows.values[k++] = all[i];
    });
    return rows;
  }
};
function displacementSets({ inward, outward, vertices }, index, surface2, moved) {
  const sides = [
    [inward, 1, "atLeast", "displacement inward"],
    [outward, -1, "atMost", "displacement outward"]
  ];
  const given = sides.filter(([value]) => value !== void 0);
  if (given.length === 0 || given.some(([value]) => !(value >= 0) || !Number.isFinite(value))) {
    throw new MorphError(
      "constraint-invalid",
      "A displacement bound needs how far inward or outward a vertex may go.",
      "Give inward, outward or both, 0 or more metres.",
      { constraint: index }
    );
  }
  const meant = intersect2(moved, vertices);
  return given.map(([value, sign, bound, label]) => ({
    index,
    kind: "displacement",
    bound,
    limit: sign === 1 ? -value : value,
    label,
    constraint: new NormalDisplacement(surface2, meant, sign, value),
    sign,
    within: Infinity,
    parentSlack: value === 0 ? new Map(Array.from(meant, (v) => [v, 0])) : /* @__PURE__ */ new Map()
  }));
}
function placeSets(constraint, index, surface2, moved, reach) {
  if (constraint.kind === "displacement") return displacementSets(constraint, index, surface2, moved);
  const { source, label, limit, kind } = constraint;
  const meant = intersect2(moved, constraint.vertices);
  const near = source.place(meant).rows(surface2.positions, 2 * reach);
  const ids = Uint32Array.from({ length: near.count }, (_, k) => near.vertices[near.starts[k]]).sort();
  const parentSlack = /* @__PURE__ */ new Map();
  for (let k = 0; k < near.count; k++) parentSlack.set(near.vertices[near.starts[k]], near.slack[k]);
  return [
    {
      index,
      kind,
      bound: "atLeast",
      limit,
      label,
      constraint: source.place(ids),
      sign: 1,
      within: 4 * reach,
      parentSlack
    }
  ];
}
var PlaceRounds = class {
  constructor(space, surface2, sets, step) {
    this.space = space;
    this.surface = surface2;
    this.sets = sets;
    let largest = 0;
    const { positions } = surface2;
    for (const v of space.moved) {
      for (let d = 0; d < 3; d++) largest = Math.max(largest, Math.abs(positions[3 * v + d]));
    }
    this.guard = 2 * FLOAT32_ULP * largest + GUARD_OF_STEP * step;
  }
  space;
  surface;
  sets;
  rows = [];
  /** The rows that the last solution was found with. */
  binding = [];
  guard;
  /**
   * Linearises at the present positions: rows at hand anew, and the worst of the places that break their limit.
   *
   * @param positions N x 3, moved
   * @param computed moved x 3: the displacement less what was made by hand
   * @param active of the rows at hand
   */
  next(positions, computed, active) {
    this.binding = this.rows;
    this.rows.forEach((row, i) => {
      row.likely = active[i];
      row.idle = active[i] ? 0 : row.idle + 1;
    });
    const kept = new Map(
      this.rows.filter((row) => row.idle < IDLE_ROUNDS).map((row) => [`${this.sets.indexOf(row.set)} ${row.vertex}`, row])
    );
    const rows = [];
    const broken = [];
    this.sets.forEach((set, s) => {
      const found = set.constraint.rows(positions, this.guard);
      for (let k = 0; k < found.count; k++) {
        const key = `${s} ${found.vertices[found.starts[k]]}`;
        const old = kept.get(key);
        const slack = found.slack[k] - this.target(set, found.vertices[found.starts[k]]);
        if (slack < -0.5 * this.guard) broken.push({ set, rows: found, k, slack });
        if (!old) continue;
        const row = this.row(set, found, k, computed, old);
        if (row) rows.push(row);
        kept.delete(key);
      }
    });
    for (const row of kept.values()) rows.push(row);
    broken.sort((a, b) => a.slack - b.slack);
    const present = new Set(rows.map((row) => `${row.label} ${row.vertex}`));
    const picked = [];
    for (const { set, rows: found, k } of broken) {
      if (picked.length === ADDED_PER_ROUND) break;
      const vertex = found.vertices[found.starts[k]];
      if (present.has(`${set.label} ${vertex}`)) continue;
      if (picked.some((p) => p.set === set && this.near(p.vertex, vertex, positions))) continue;
      const row = this.row(set, found, k, computed, null);
      if (!row) continue;
      picked.push({ set, vertex });
      rows.push(row);
    }
    this.rows = rows;
    return { worst: broken.length > 0 ? -broken[0].slack : 0, labels: [...new Set(broken.map((b) => b.set.label))] };
  }
  /**
   * What a place's slack must come to: a guard above its limit, or what the parent has where that is less. A parent that
   * breaks a limit by more than rounding is brought back to it.
   */
  target(set, vertex) {
    const parent = set.parentSlack.get(vertex) ?? Infinity;
    return parent < -this.guard ? this.guard : Math.min(this.guard, parent);
  }
  near(a, b, positions) {
    let sum = 0;
    for (let d = 0; d < 3; d++) sum += (positions[3 * a + d] - positions[3 * b + d]) ** 2;
    return sum < this.space.spacing ** 2;
  }
  row(set, found, k, computed, old) {
    const row = this.space.placeRow(found, k);
    if (dot(row, row) === 0) return null;
    const vertex = found.vertices[found.starts[k]];
    const solved = this.space.solve(row);
    let here = 0;
    for (let t2 = found.starts[k]; t2 < found.starts[k + 1]; t2++) {
      const i = this.slot(found.vertices[t2]);
      if (i < 0) continue;
      for (let d = 0; d < 3; d++) here += found.vectors[3 * t2 + d] * computed[3 * i + d];
    }
    return {
      row,
      solved,
      field: null,
      bound: "atLeast",
      tolerance: 0.1 * this.guard,
      change: this.target(set, vertex) - found.slack[k] + here,
      label: set.label,
      set,
      vertex,
      idle: old?.idle ?? 0,
      likely: old?.likely ?? true
    };
  }
  slots = null;
  slot(vertex) {
    if (!this.slots) {
      this.slots = new Int32Array(this.surface.positions.length / 3).fill(-1);
      this.space.moved.forEach((v, i) => this.slots[v] = i);
    }
    return this.slots[vertex];
  }
};
function worstPlace(set, positions) {
  const found = set.constraint.rows(positions, set.within);
  let best = -1;
  for (let k = 0; k < found.count; k++) if (best < 0 || found.slack[k] < found.slack[best]) best = k;
  return best < 0 ? null : { value: set.sign * found.values[best], slack: found.slack[best], vertex: found.vertices[found.starts[best]] };
}

// src/lib/morph/store.ts
var cell = new DataView(new ArrayBuffer(4));
function applyDisplacement(positions, moved, displacement) {
  const out = positions.slice();
  for (let i = 0; i < moved.length; i++) {
    const v = 3 * moved[i];
    out[v] += displacement[3 * i];
    out[v + 1] += displacement[3 * i + 1];
    out[v + 2] += displacement[3 * i + 2];
  }
  return out;
}

// src/lib/morph/reports.ts
var VOLUME_KEPT = 1e-9;
var OBJECTIVE_KEPT = 1e-9;
var PLACE_KEPT = 1e-9;
var keeps = (value, bound, limit, tolerance) => (bound !== "atMost" ? value >= limit - tolerance : true) && (bound !== "atLeast" ? value <= limit + tolerance : true);
function reports(input) {
  const { surface: surface2, linear, sets, predicted, volumeAfter, prices } = input;
  const none = { active: false, price: 0, places: 0 };
  const largest = Math.max(...predicted.map((p) => Math.abs(p.change)));
  const ofLinear = linear.map(({ constraint, index, limit }, i) => {
    const { kind, bound } = constraint;
    const { active, price } = prices?.linear[i] ?? none;
    if (kind === "volume") {
      const before = surface2.volume;
      const kept2 = keeps(volumeAfter, bound, limit, VOLUME_KEPT * Math.abs(limit));
      return { index, kind, bound, limit, before, after: volumeAfter, kept: kept2, active, price };
    }
    const { objectiveId } = constraint;
    const after2 = predicted.find((p) => p.objectiveId === objectiveId)?.change ?? 0;
    const kept = keeps(after2, bound, limit, OBJECTIVE_KEPT * (Math.abs(limit) + largest));
    return { index, kind, objectiveId, bound, limit, before: 0, after: after2, kept, active, price };
  });
  if (sets.length === 0) return ofLinear;
  const after = applyDisplacement(surface2.positions, input.moved, input.displacement);
  const extent = after.reduce((max, x) => Math.max(max, Math.abs(x)), 0);
  const ofSets = sets.map((set, i) => {
    const { index, kind, bound, limit } = set;
    const { active, price, places } = prices?.sets[i] ?? none;
    const was = kind === "displacement" ? { value: 0 } : worstPlace(set, surface2.positions);
    const is = worstPlace(set, after);
    const kept = is === null || is.slack >= -PLACE_KEPT * extent;
    const v = is?.vertex ?? 0;
    const place = is && [after[3 * v], after[3 * v + 1], after[3 * v + 2]];
    return {
      index,
      kind,
      bound,
      limit,
      before: was?.value ?? null,
      after: is?.value ?? null,
      kept,
      places,
      place,
      active,
      price
    };
  });
  return [...ofLinear, ...ofSets].sort((a, b) => a.index - b.index);
}

// src/lib/morph/moved-set.ts
var MovedSet = class {
  constructor(operators, vertexCount) {
    this.operators = operators;
    if (operators.length === 1) {
      this.ids = operators[0].inside;
      this.slots = [null];
      return;
    }
    const mark = new Uint8Array(vertexCount);
    let count = 0;
    for (const op of operators) {
      for (const v of op.inside) {
        if (!mark[v]) {
          mark[v] = 1;
          count++;
        }
      }
    }
    this.ids = new Uint32Array(count);
    const slot = new Uint32Array(vertexCount);
    for (let v = 0, at = 0; v < vertexCount; v++) {
      if (!mark[v]) continue;
      slot[v] = at;
      this.ids[at++] = v;
    }
    this.slots = operators.map((op) => Uint32Array.from(op.inside, (v) => slot[v]));
  }
  operators;
  ids;
  slots;
  /** The surface field of lattice displacements (by box, nPoints x 3), summed over the boxes. */
  evaluate(lattices) {
    const single = this.slots[0] === null;
    if (single) return this.operators[0].evaluate(lattices[0]);
    const out = new Float64Array(3 * this.ids.length);
    this.operators.forEach((op, b) => {
      const part = op.evaluate(lattices[b]);
      const slots = this.slots[b];
      for (let i = 0; i < slots.length; i++) {
        const at = 3 * slots[i];
        out[at] += part[3 * i];
        out[at + 1] += part[3 * i + 1];
        out[at + 2] += part[3 * i + 2];
      }
    });
    return out;
  }
};

// src/lib/morph/space.ts
function mirrorField(field, { partners, normal }) {
  for (let i = 0; i < partners.length; i++) {
    const j = partners[i];
    if (j <= i) continue;
    const own = [field[3 * i], field[3 * i + 1], field[3 * i + 2]];
    const image = reflectVector([field[3 * j], field[3 * j + 1], field[3 * j + 2]], normal);
    const mean = [
      0.5 * (own[0] + image[0]),
      0.5 * (own[1] + image[1]),
      0.5 * (own[2] + image[2])
    ];
    field.set(mean, 3 * i);
    field.set(reflectVector(mean, normal), 3 * j);
  }
}
function keepOnPlane(field, moved, flags, [nx, ny, nz]) {
  for (let i = 0; i < moved.length; i++) {
    if (!flags[moved[i]]) continue;
    const across = field[3 * i] * nx + field[3 * i + 1] * ny + field[3 * i + 2] * nz;
    field[3 * i] = nx === 1 ? 0 : field[3 * i] - across * nx;
    field[3 * i + 1] = ny === 1 ? 0 : field[3 * i + 1] - across * ny;
    field[3 * i + 2] = nz === 1 ? 0 : field[3 * i + 2] - across * nz;
  }
}
var LatticeSpace = class {
  constructor(operators, system, vertexCount, mirror) {
    this.operators = operators;
    this.system = system;
    this.set = new MovedSet(operators, vertexCount);
    this.moved = this.set.ids;
    this.unknowns = system.unknowns;
    this.plane = mirror && { ...mirror, partners: mirrorPartners(mirror.positions, this.moved, mirror.plane) };
    this.spacing = 0.35 * Math.min(...operators.flatMap(({ box }) => box.halfSize.map((h, d) => 2 * h / (box.lattice[d] - 1))));
  }
  operators;
  system;
  moved;
  unknowns;
  spacing;
  set;
  plane;
  row(gradient2) {
    return this.system.reduce(this.operators.map((op) => op.project(gradient2)));
  }
  placeRow({ starts, vertices, vectors }, k) {
    const lattices = this.operators.map((op) => new Float64Array(3 * op.pointCount));
    for (let t2 = starts[k]; t2 < starts[k + 1]; t2++) {
      let [x, y, z] = [vectors[3 * t2], vectors[3 * t2 + 1], vectors[3 * t2 + 2]];
      if (this.plane?.flags[vertices[t2]]) {
        const n = this.plane.normal;
        const across = x * n[0] + y * n[1] + z * n[2];
        [x, y, z] = [x - across * n[0], y - across * n[1], z - across * n[2]];
      }
      this.operators.forEach((op, b) => op.projectVertex(vertices[t2], x, y, z, lattices[b]));
    }
    return this.system.reduce(lattices);
  }
  solve(row) {
    return this.system.solve(row);
  }
  field(reduced) {
    return this.ofLattices(this.system.expand(reduced));
  }
  lattices(reduced) {
    return this.system.expand(reduced);
  }
  get partners() {
    return this.plane?.partners ?? null;
  }
  /** The surface's displacement by lattice displacements, moved x 3. */
  ofLattices(lattices) {
    const field = this.set.evaluate(lattices);
    if (this.plane) {
      keepOnPlane(field, this.moved, this.plane.flags, this.plane.normal);
      mirrorField(field, this.plane);
    }
    return field;
  }
};
var emptyBox = (box) => new MorphError(
  "box-empty",
  `Design box "${box.name ?? box.id}" holds no vertex of the surface.`,
  "Move or enlarge the box until it meets the surface.",
  { box: box.name ?? box.id }
);
var lockedBox = (box) => new MorphError(
  "no-free-points",
  `Everything in design box "${box.name ?? box.id}" is locked.`,
  "Unlock a part of the surface in it, or leave the box out of the move.",
  { box: box.name ?? box.id }
);

// src/lib/morph/laplacian.ts
function helmholtz(positions, triangles, slot, mass, radius) {
  const size = mass.length;
  const room = new Uint32Array(size + 1);
  for (let i = 0; i < triangles.length; i += 3) {
    const [a, b, c] = [slot[triangles[i]], slot[triangles[i + 1]], slot[triangles[i + 2]]];
    if (a < 0 || b < 0 || c < 0) continue;
    room[a + 1] += 2;
    room[b + 1] += 2;
    room[c + 1] += 2;
  }
  for (let i = 0; i < size; i++) room[i + 1] += room[i];
  const fill = room.slice(0, size);
  const columns = new Uint32Array(room[size]);
  const values = new Float64Array(room[size]);
  const diagonal = Float64Array.from(mass);
  const square = radius * radius;
  const put = (i, j, weight) => {
    columns[fill[i]] = j;
    values[fill[i]++] = -weight;
    columns[fill[j]] = i;
    values[fill[j]++] = -weight;
    diagonal[i] += weight;
    diagonal[j] += weight;
  };
  for (let i = 0; i < triangles.length; i += 3) {
    const a = slot[triangles[i]];
    const b = slot[triangles[i + 1]];
    const c = slot[triangles[i + 2]];
    if (a < 0 || b < 0 || c < 0) continue;
    const p = 3 * triangles[i];
    const q = 3 * triangles[i + 1];
    const r = 3 * triangles[i + 2];
    const ux = positions[q] - positions[p];
    const uy = positions[q + 1] - positions[p + 1];
    const uz = positions[q + 2] - positions[p + 2];
    const vx = positions[r] - positions[p];
    const vy = positions[r + 1] - positions[p + 1];
    const vz = positions[r + 2] - positions[p + 2];
    const doubleArea = Math.hypot(uy * vz - uz * vy, uz * vx - ux * vz, ux * vy - uy * vx);
    if (!(doubleArea > 0)) continue;
    const uu = ux * ux + uy * uy + uz * uz;
    const vv = vx * vx + vy * vy + vz * vz;
    const uv = ux * vx + uy * vy + uz * vz;
    const half = 0.5 * square / doubleArea;
    put(b, c, half * uv);
    put(a, c, half * (uu - uv));
    put(a, b, half * (vv - uv));
  }
  return merge({ size, starts: room, columns, values, diagonal });
}
function merge(raw) {
  const { size, starts, columns, values, diagonal } = raw;
  const merged = new Uint32Array(size + 1);
  let at = 0;
  for (let i = 0; i < size; i++) {
    const end = starts[i + 1];
    for (let k = starts[i] + 1; k < end; k++) {
      const column = columns[k];
      const value = values[k];
      let j = k - 1;
      for (; j >= starts[i] && columns[j] > column; j--) {
        columns[j + 1] = columns[j];
        values[j + 1] = values[j];
      }
      columns[j + 1] = column;
      values[j + 1] = value;
    }
    for (let k = starts[i]; k < end; k++) {
      if (at > merged[i] && columns[at - 1] === columns[k]) values[at - 1] += values[k];
      else {
        columns[at] = columns[k];
        values[at++] = values[k];
      }
    }
    merged[i + 1] = at;
  }
  return { size, starts: merged, columns: columns.slice(0, at), values: values.slice(0, at), diagonal };
}
var MAX_ITERATIONS = 2e4;
function solveSparse(matrix, b, tolerance) {
  const { size, starts, columns, values, diagonal } = matrix;
  const x = new Float64Array(size);
  const residual = b.slice();
  const z = new Float64Array(size);
  const direction2 = new Float64Array(size);
  const image = new Float64Array(size);
  const precondition = () => {
    for (let i = 0; i < size; i++) {
      let sum = residual[i];
      for (let k = starts[i]; k < starts[i + 1]; k++) {
        const j = columns[k];
        if (j >= i) break;
        sum -= values[k] * z[j];
      }
      z[i] = sum / diagonal[i];
    }
    for (let i = size - 1; i >= 0; i--) {
      let sum = 0;
      for (let k = starts[i + 1] - 1; k >= starts[i]; k--) {
        const j = columns[k];
        if (j <= i) break;
        sum += values[k] * z[j];
      }
      z[i] -= sum / diagonal[i];
    }
  };
  const inner = (p, q) => {
    let sum = 0;
    for (let i = 0; i < size; i++) sum += p[i] * q[i];
    return sum;
  };
  const goal = tolerance * Math.sqrt(inner(b, b));
  if (goal === 0) return x;
  let rho = 0;
  for (let iteration = 0; iteration < MAX_ITERATIONS; iteration++) {
    precondition();
    const next = inner(residual, z);
    const beta = iteration === 0 ? 0 : next / rho;
    rho = next;
    let curvature = 0;
    for (let i = 0; i < size; i++) direction2[i] = z[i] + beta * direction2[i];
    for (let i = 0; i < size; i++) {
      let sum = diagonal[i] * direction2[i];
      for (let k = starts[i]; k < starts[i + 1]; k++) sum += values[k] * direction2[columns[k]];
      image[i] = sum;
      curvature += sum * direction2[i];
    }
    const length = rho / curvature;
    let left = 0;
    for (let i = 0; i < size; i++) {
      x[i] += length * direction2[i];
      residual[i] -= length * image[i];
      left += residual[i] * residual[i];
    }
    if (Math.sqrt(left) <= goal) return x;
    if (!Number.isFinite(left)) break;
  }
  throw new MorphError(
    "metric-singular",
    "The smoothing of the surface does not settle.",
    "Take a shorter smoothing length, or repair triangles without area."
  );
}

// src/lib/morph/surface-space.ts
var SOLVE_TOLERANCE = 1e-10;
var rise = (t2) => t2 >= 1 ? 1 : t2 <= 0 ? 0 : t2 * t2 * t2 * (10 + t2 * (6 * t2 - 15));
function fade(box, uvw) {
  const { u0, u1, v0, v1, w0, w1 } = box.held;
  const held = [
    [u0, u1],
    [v0, v1],
    [w0, w1]
  ];
  const bands = held.map((pair, d) => pair.map((h) => Math.min(0.5, Math.max(1, h) / (box.lattice[d] - 1))));
  return Float64Array.from({ length: uvw.length / 3 }, (_, i) => {
    let factor = 1;
    for (let d = 0; d < 3; d++) {
      const t2 = uvw[3 * i + d];
      factor *= rise(t2 / bands[d][0]) * rise((1 - t2) / bands[d][1]);
    }
    return factor;
  });
}
var SurfaceSpace = class {
  moved;
  unknowns;
  spacing;
  insideCounts;
  partners;
  /** moved x 3: w n */
  directions;
  matrix;
  slot;
  /**
   * @param weights N in [0, 1] by vertex, or undefined
   * @param given the first boxes, which must not be empty; later ones are mirror images
   * @throws MorphError box-empty
   */
  constructor(surface2, boxes, given, smoothing, weights, mirror) {
    const { positions, triangles, mass, normals } = surface2;
    const count = mass.length;
    const left = new Float64Array(count).fill(1);
    this.insideCounts = boxes.map((box, b) => {
      const { inside, uvw } = embed(positions, box);
      if (inside.length === 0 && b < given) throw emptyBox(box);
      const factors = fade(box, uvw);
      inside.forEach((v, i) => left[v] *= 1 - factors[i]);
      return inside.length;
    });
    const share = left.map((l, v) => (1 - l) * (weights ? weights[v] : 1));
    const ids = [];
    share.forEach((w, v) => {
      if (w > 0 && mass[v] > 0) ids.push(v);
    });
    this.moved = Uint32Array.from(ids);
    if (this.moved.length === 0) {
      throw new MorphError(
        "no-free-points",
        "Everything in the design boxes is locked.",
        "Unlock a part of the surface in them, or move the boxes."
      );
    }
    this.unknowns = this.moved.length;
    this.slot = new Int32Array(count).fill(-1);
    this.moved.forEach((v, i) => this.slot[v] = i);
    this.directions = new Float64Array(3 * this.moved.length);
    this.moved.forEach((v, i) => {
      for (let d = 0; d < 3; d++) this.directions[3 * i + d] = share[v] * normals[3 * v + d];
    });
    if (mirror) keepOnPlane(this.directions, this.moved, mirror.flags, mirror.normal);
    this.partners = mirror && mirrorPartners(positions, this.moved, mirror.plane);
    this.matrix = helmholtz(
      positions,
      triangles,
      this.slot,
      Float64Array.from(this.moved, (v) => mass[v]),
      smoothing
    );
    this.spacing = smoothing;
  }
  row(gradient2) {
    const { moved, directions } = this;
    const out = new Float64Array(moved.length);
    for (let i = 0; i < moved.length; i++) {
      const v = 3 * moved[i];
      out[i] = directions[3 * i] * gradient2[v] + directions[3 * i + 1] * gradient2[v + 1] + directions[3 * i + 2] * gradient2[v + 2];
    }
    return [out];
  }
  placeRow({ starts, vertices, vectors }, k) {
    const out = new Float64Array(this.moved.length);
    for (let t2 = starts[k]; t2 < starts[k + 1]; t2++) {
      const i = this.slot[vertices[t2]];
      if (i < 0) continue;
      for (let d = 0; d < 3; d++) out[i] += this.directions[3 * i + d] * vectors[3 * t2 + d];
    }
    return [out];
  }
  solve([row]) {
    const q = solveSparse(this.matrix, row, SOLVE_TOLERANCE);
    this.partners?.forEach((j, i) => {
      if (j > i) q[i] = q[j] = 0.5 * (q[i] + q[j]);
    });
    return [q];
  }
  field([q]) {
    const out = this.directions.slice();
    for (let i = 0; i < q.length; i++) {
      out[3 * i] *= q[i];
      out[3 * i + 1] *= q[i];
      out[3 * i + 2] *= q[i];
    }
    return out;
  }
  lattices() {
    return [];
  }
};

// src/lib/morph/volume-change.ts
function touchedTriangles(triangles, moved, vertexCount) {
  const mark = new Uint8Array(vertexCount);
  for (let i = 0; i < moved.length; i++) mark[moved[i]] = 1;
  const out = new Uint32Array(triangles.length / 3);
  let count = 0;
  for (let t2 = 0; t2 < out.length; t2++) {
    if (mark[triangles[3 * t2]] | mark[triangles[3 * t2 + 1]] | mark[triangles[3 * t2 + 2]]) out[count++] = t2;
  }
  return out.slice(0, count);
}
var det = (ax, ay, az, bx, by, bz, cx, cy, cz) => ax * (by * cz - bz * cy) + ay * (bz * cx - bx * cz) + az * (bx * cy - by * cx);
var VolumeChange = class {
  constructor(surface2, moved) {
    this.surface = surface2;
    const n = surface2.positions.length / 3;
    this.touched = touchedTriangles(surface2.triangles, moved, n);
    this.centre = surface2.origin;
    this.slot = new Uint32Array(n);
    for (let i = 0; i < moved.length; i++) this.slot[moved[i]] = i + 1;
  }
  surface;
  touched;
  centre;
  /** Position of each vertex among the moved ones plus one; 0 for the others. */
  slot;
  /**
   * V(x + d + t e) - V(x) for every t.
   * @param displacement d, moved x 3
   * @param correction e, moved x 3, or null when only t = 0 is asked
   */
  cubic(displacement, correction) {
    const { positions, triangles } = this.surface;
    const { touched, slot } = this;
    const [ox, oy, oz] = this.centre;
    const x = new Float64Array(9);
    const y = new Float64Array(9);
    const e = new Float64Array(9);
    let c0 = 0;
    let c1 = 0;
    let c2 = 0;
    let c3 = 0;
    for (let k = 0; k < touched.length; k++) {
      const t2 = 3 * touched[k];
      for (let j = 0; j < 3; j++) {
        const v = triangles[t2 + j];
        x[3 * j] = positions[3 * v] - ox;
        x[3 * j + 1] = positions[3 * v + 1] - oy;
        x[3 * j + 2] = positions[3 * v + 2] - oz;
        const s = 3 * (slot[v] - 1);
        for (let d = 0; d < 3; d++) {
          y[3 * j + d] = s < 0 ? x[3 * j + d] : x[3 * j + d] + displacement[s + d];
          e[3 * j + d] = s < 0 || !correction ? 0 : correction[s + d];
        }
      }
      const before = det(x[0], x[1], x[2], x[3], x[4], x[5], x[6], x[7], x[8]);
      c0 += det(y[0], y[1], y[2], y[3], y[4], y[5], y[6], y[7], y[8]) - before;
      if (correction) {
        c1 += det(e[0], e[1], e[2], y[3], y[4], y[5], y[6], y[7], y[8]) + det(y[0], y[1], y[2], e[3], e[4], e[5], y[6], y[7], y[8]) + det(y[0], y[1], y[2], y[3], y[4], y[5], e[6], e[7], e[8]);
        c2 += det(e[0], e[1], e[2], e[3], e[4], e[5], y[6], y[7], y[8]) + det(e[0], e[1], e[2], y[3], y[4], y[5], e[6], e[7], e[8]) + det(y[0], y[1], y[2], e[3], e[4], e[5], e[6], e[7], e[8]);
        c3 += det(e[0], e[1], e[2], e[3], e[4], e[5], e[6], e[7], e[8]);
      }
    }
    return [c0 / 6, c1 / 6, c2 / 6, c3 / 6];
  }
};
function nearRoot([c0, c1, c2, c3], target) {
  let t2 = 0;
  for (let k = 0; k < 30; k++) {
    const value = c0 + t2 * (c1 + t2 * (c2 + t2 * c3)) - target;
    const slope = c1 + t2 * (2 * c2 + t2 * 3 * c3);
    if (!(Math.abs(slope) > 0)) return null;
    const step = value / slope;
    t2 -= step;
    if (!Number.isFinite(t2)) return null;
    if (Math.abs(step) <= 1e-15 * Math.abs(t2)) return t2;
  }
  return t2;
}

// src/lib/morph/move.ts
var DEFAULT_EPS = 1e-6;
var VOLUME_SLACK = 1e-13;
var MAX_ROUNDS = 60;
var STALLED_ROUNDS = 12;
var direction = (o) => o.sense === "minimise" ? o.weight : o.sense === "maximise" ? -o.weight : 0;
function prepareMove(surface2, boxes, options) {
  const { smoothing, eps = DEFAULT_EPS, weights, symmetry, path = "auto", checkpoint } = options;
  if (!Number.isFinite(smoothing) || smoothing < 0) {
    throw new MorphError(
      "smoothing-invalid",
      `The smoothing length ${smoothing} is no length.`,
      "Give 0 or more metres."
    );
  }
  if (!Number.isFinite(eps) || eps < 0) {
    throw new MorphError("smoothing-invalid", `The regularisation ${eps} is not usable.`, "Give eps of 0 or more.");
  }
  if (boxes.length === 0) {
    throw new MorphError("box-empty", "The move names no design box.", "Choose at least one design box.");
  }
  const n = surface2.positions.length / 3;
  if (weights && (weights.length !== n || weights.some((w) => !(w >= 0 && w <= 1)))) {
    throw new MorphError("mesh-shape", "The vertex weights do not fit the surface.", "Give N weights in [0, 1].");
  }
  boxes.forEach(checkBox);
  const tied = symmetry ? tieBoxes(boxes, symmetry) : null;
  const plane = symmetry ? {
    plane: symmetry,
    positions: surface2.positions,
    flags: onPlane(surface2.positions, symmetry),
    normal: planeNormal(symmetry)
  } : null;
  if (options.mode === "surface") {
    const space2 = new SurfaceSpace(surface2, tied?.boxes ?? boxes, boxes.length, smoothing, weights, plane);
    checkpoint?.(1);
    return new Move(surface2, boxes, space2, space2.insideCounts.slice(0, boxes.length), null);
  }
  const operators = [];
  const standing = [];
  (tied?.boxes ?? boxes).forEach((box, b) => {
    const op = new BoxOperator(box, surface2, weights, path);
    if (op.inside.length === 0 && b >= boxes.length) return;
    if (op.inside.length === 0) throw emptyBox(box);
    if (weights && !op.inside.some((v) => weights[v] > 0)) throw lockedBox(box);
    standing.push(b);
    operators.push(op);
  });
  checkpoint?.(0.1);
  const ties = tied && {
    normal: tied.normal,
    list: tied.ties.map((tie) => ({ ...tie, image: standing.indexOf(tie.image) }))
  };
  const report = checkpoint && ((f) => checkpoint(0.1 + 0.9 * f));
  const system = new ReducedSystem(operators, surface2, smoothing, eps, ties, report);
  const space = new LatticeSpace(operators, system, n, plane);
  const inside = operators.map((op) => op.inside.length);
  return new Move(
    surface2,
    operators.map((op) => op.box),
    space,
    inside,
    {
      given: boxes.length,
      operators,
      ties,
      space
    }
  );
}
var Move = class {
  /** @param lattices null in surface mode */
  constructor(surface2, boxes, space, insideCounts, lattices) {
    this.surface = surface2;
    this.boxes = boxes;
    this.space = space;
    this.insideCounts = insideCounts;
    this.lattices = lattices;
    this.moved = space.moved;
    this.freePoints = lattices?.operators.map((op) => op.free.length) ?? boxes.map(() => 0);
    this.unknowns = space.unknowns;
    this.path = lattices?.operators.some((op) => op.path === "moments") ? "moments" : "direct";
    this.gradients = new GradientCache(space);
  }
  surface;
  boxes;
  space;
  insideCounts;
  lattices;
  moved;
  freePoints;
  unknowns;
  path;
  gradients;
  volumes = null;
  /** The control points' displacements made by hand, images filled in. */
  byHand(hand) {
    if (!this.lattices) {
      throw new MorphError(
        "hand-invalid",
        "In surface mode there are no control points to move by hand.",
        "Choose the mode lattice, or leave the hand-made displacement out."
      );
    }
    const { given, operators, ties, space } = this.lattices;
    const lattices = handLattices(hand, given, operators, ties);
    return { lattices, field: space.ofLattices(lattices) };
  }
  get volumeChange() {
    this.volumes ??= new VolumeChange(this.surface, this.moved);
    return this.volumes;
  }
  solve(request) {
    const { objectives, step, constraints, checkpoint } = request;
    if (!Number.isFinite(step) || step <= 0) {
      throw new MorphError("step-invalid", `The step ${step} is no length.`, "Give a step of more than 0 metres.");
    }
    checkObjectives(objectives, this.surface);
    const steering = this.steering(objectives);
    checkpoint?.(0.4);
    const byHand = request.hand ? this.byHand(request.hand) : null;
    const hand = byHand?.field ?? null;
    const linear = this.linearParts(constraints, objectives);
    const sets = this.placeSets(constraints, step + (hand ? displacementNorms(hand).max : 0));
    checkpoint?.(0.5);
    const { fitted, coefficients, descent, rounds } = this.descend(steering, linear, sets, hand, step, checkpoint);
    checkpoint?.(0.9);
    const lattices = this.space.lattices(descent.reduced(coefficients));
    byHand?.lattices.forEach((lattice, b) => lattice.forEach((x, i) => lattices[b][i] += x));
    const { displacement, a } = fitted;
    const prices = this.prices(fitted, linear, sets, rounds);
    checkpoint?.(1);
    return {
      ...this.outcome(displacement, objectives, linear, sets, prices),
      lattices,
      metricLength: Math.sqrt(descent.squaredLength(coefficients)),
      stepFactor: a
    };
  }
  /** The weighted gradient of the objectives that steer. */
  steering(objectives) {
    const steering = objectives.filter((o) => direction(o) !== 0);
    if (steering.length === 0) {
      throw new MorphError(
        "gradient-missing",
        "No objective steers the move: each is held or has the weight 0.",
        "Give at least one objective with a map, a weight above 0 and the sense minimise or maximise."
      );
    }
    const prepared2 = steering.map((o) => this.gradients.get(o.gradient));
    const factors = steering.map(direction);
    const row = combine(
      factors,
      prepared2.map((p) => p.row)
    );
    const solved = combine(
      factors,
      prepared2.map((p) => p.solved)
    );
    if (!(dot(row, solved) > 0)) {
      throw new MorphError(
        "gradient-zero",
        "The maps of the weighted objectives are zero on everything that may move.",
        "Place a design box where the map is not zero, or check the map and its sign."
      );
    }
    return {
      row,
      solved,
      field: mix(
        factors,
        prepared2.map((p) => p.field)
      )
    };
  }
  linearParts(constraints, objectives) {
    return constraints.flatMap((c, index) => {
      if (c.kind === "volume" || c.kind === "objective") {
        return [linearPart(c, index, this.surface, this.gradients, objectives)];
      }
      if (c.kind === "displacement" || c.kind === "keepOut" || c.kind === "thickness") return [];
      throw new MorphError(
        "unsupported",
        `Constraints of the kind "${String(c.kind)}" are not available.`,
        "Use the kinds volume, objective, displacement, keepOut and thickness.",
        { constraint: index }
      );
    });
  }
  placeSets(constraints, reach) {
    return constraints.flatMap(
      (c, index) => c.kind === "volume" || c.kind === "objective" ? [] : placeSets(c, index, this.surface, this.moved, reach)
    );
  }
  /**
   * The move for the linear constraints; then, in rounds, for those of the places that it breaks, each linearised where
   * the surface has come to.
   */
  descend(steering, linear, sets, hand, step, checkpoint) {
    const rounds = sets.length > 0 ? new PlaceRounds(this.space, this.surface, sets, step) : null;
    const base = linear.map(({ constraint, prepared: prepared2, gradient: gradient2, change, label }) => ({
      ...prepared2,
      bound: constraint.bound,
      change: hand ? change - along(gradient2, this.moved, hand) : change,
      label
    }));
    let best = Infinity;
    let stalled = 0;
    let mostBinding = 0;
    for (let round = 0; ; round++) {
      const placed = rounds?.rows ?? [];
      const descent = new Descent(this.space, steering, [...base, ...placed], placed.length, hand);
      const fitted = descent.fit(step);
      const coefficients = [-fitted.a, ...fitted.mu];
      this.restoreVolume(linear, descent, fitted, coefficients);
      if (!rounds) return { fitted, coefficients, descent, rounds };
      const positions = applyDisplacement(this.surface.positions, this.moved, fitted.displacement);
      const computed = hand ? mix([1, -1], [fitted.displacement, hand]) : fitted.displacement;
      const { worst, labels } = rounds.next(positions, computed, fitted.active.slice(base.length));
      console.log("round", round, "rows", placed.length, "active", fitted.active.filter(Boolean).length, "a", fitted.a.toPrecision(6), "worst", worst.toPrecision(3), "fits", globalThis.fits);
      globalThis.fits = 0;
      if (worst === 0) return { fitted, coefficients, descent, rounds };
      linear.forEach(({ constraint, gradient: gradient2, change }, i) => {
        if (constraint.kind !== "volume") return;
        const curved = this.volumeChange.cubic(fitted.displacement, null)[0];
        base[i].change = change - curved + along(gradient2, this.moved, computed);
      });
      const binding = fitted.active.filter(Boolean).length;
      if (worst < 0.7 * best || binding > mostBinding) stalled = 0;
      else stalled++;
      best = Math.min(best, worst);
      mostBinding = Math.max(mostBinding, binding);
      if (stalled > STALLED_ROUNDS || round === MAX_ROUNDS) throw this.conflict(labels, descent, fitted, worst);
      checkpoint?.(0.5 + 0.4 * (1 - 1 / (2 + round)));
    }
  }
  conflict(broken, descent, { active }, worst) {
    const with_ = descent.dual.constraints.filter((c, i) => active[i] && !broken.includes(c.label)).map((c) => c.label);
    const quoted = (labels) => [...new Set(labels)].map((l) => `"${l}"`).join(", ");
    return new MorphError(
      "constraint-conflict",
      `No move keeps all constraints: ${quoted(broken)} would still be broken by ${worst.toPrecision(3)} m` + (with_.length > 0 ? ` where ${quoted(with_)} must be kept.` : " where the boxes let the surface move."),
      "Relax or remove one of these constraints, take a shorter step, or free more control points."
    );
  }
  /**
   * Brings the volume of the curved surface to its bound exactly, along the shortest correction in the metric that
   * leaves the other active constraints alone. Changes displacement, coefficients and active in place.
   */
  restoreVolume(linear, descent, fitted, coefficients) {
    const { displacement, active } = fitted;
    linear.forEach(({ constraint, index, limit }, i) => {
      if (constraint.kind !== "volume") return;
      const target = limit - this.surface.volume;
      if (!active[i]) {
        const [change] = this.volumeChange.cubic(displacement, null);
        const slack = VOLUME_SLACK * Math.abs(this.surface.volume);
        if (constraint.bound === "atLeast" ? change >= target - slack : change <= target + slack) return;
        active[i] = true;
      }
      const shares = descent.dual.correction(i, active);
      const correction = descent.field([0, ...shares]);
      const t2 = nearRoot(this.volumeChange.cubic(displacement, correction), target);
      if (t2 === null || Math.abs(t2) * displacementNorms(correction).max > displacementNorms(displacement).max) {
        throw new MorphError(
          "constraint-conflict",
          "The volume cannot be restored after the move.",
          "Take a shorter step.",
          { constraint: index }
        );
      }
      for (let k = 0; k < displacement.length; k++) displacement[k] += t2 * correction[k];
      shares.forEach((s, k) => coefficients[k + 1] += t2 * s);
    });
  }
  /** By report key: whether it binds, its price, and at how many places. */
  prices({ a, mu, active }, linear, sets, rounds) {
    const ofLinear = linear.map(({ constraint }, i) => ({
      active: active[i],
      price: active[i] ? (constraint.bound === "atLeast" ? mu[i] : -mu[i]) / a : 0,
      places: 0
    }));
    const ofSets = sets.map((set) => {
      let price = 0;
      let places = 0;
      rounds?.binding.forEach((row, k) => {
        const i = linear.length + k;
        if (row.set !== set || !active[i]) return;
        price += mu[i] / a;
        places++;
      });
      return { active: places > 0, price, places };
    });
    return { linear: ofLinear, sets: ofSets };
  }
  /** What is said of any displacement. */
  outcome(displacement, objectives, linear, sets, prices) {
    const { max, rms } = displacementNorms(displacement);
    const predicted = objectives.map((o) => ({
      objectiveId: o.id,
      change: along(o.gradient, this.moved, displacement)
    }));
    const volumeBefore = this.surface.volume;
    const volumeAfter = volumeBefore + this.volumeChange.cubic(displacement, null)[0];
    return {
      moved: this.moved,
      partners: this.space.partners,
      displacement,
      predicted,
      predictedWeighted: objectives.reduce((sum, o, i) => sum + direction(o) * predicted[i].change, 0),
      maxDisplacement: max,
      rmsDisplacement: rms,
      volumeBefore,
      volumeAfter,
      constraints: reports({
        surface: this.surface,
        moved: this.moved,
        displacement,
        linear,
        sets,
        predicted,
        volumeAfter,
        prices
      })
    };
  }
  applyByHand(lattices, objectives, constraints = []) {
    checkObjectives(objectives, this.surface);
    const byHand = this.byHand(lattices);
    const displacement = byHand.field;
    const linear = this.linearParts(constraints, objectives);
    const sets = this.placeSets(constraints, displacementNorms(displacement).max);
    return { ...this.outcome(displacement, objectives, linear, sets, null), lattices: byHand.lattices };
  }
};

// src/lib/morph/crossing.ts
var FLAT = 1e-10;
function side(q, a, b, c, p, d, flat) {
  const x = q[a];
  const y = q[a + 1];
  const z = q[a + 2];
  const ux = q[b] - x;
  const uy = q[b + 1] - y;
  const uz = q[b + 2] - z;
  const vx = q[c] - x;
  const vy = q[c + 1] - y;
  const vz = q[c + 2] - z;
  const det2 = (p[d] - x) * (uy * vz - uz * vy) + (p[d + 1] - y) * (uz * vx - ux * vz) + (p[d + 2] - z) * (ux * vy - uy * vx);
  return det2 <= flat && det2 >= -flat ? 0 : det2;
}
function along2(p, d, e, q, a, b, flat) {
  const x = p[d];
  const y = p[d + 1];
  const z = p[d + 2];
  const ux = p[e] - x;
  const uy = p[e + 1] - y;
  const uz = p[e + 2] - z;
  const vx = q[a] - x;
  const vy = q[a + 1] - y;
  const vz = q[a + 2] - z;
  const det2 = (q[b] - x) * (uy * vz - uz * vy) + (q[b + 1] - y) * (uz * vx - ux * vz) + (q[b + 2] - z) * (ux * vy - uy * vx);
  return det2 <= flat && det2 >= -flat ? 0 : det2;
}
function pierces(p, d, e, q, a, b, c, size) {
  const flat = FLAT * size * size * size;
  const from = side(q, a, b, c, p, d, flat);
  if (from === 0) return false;
  const to = side(q, a, b, c, p, e, flat);
  if (!(from > 0 ? to < 0 : to > 0)) return false;
  const x = along2(p, d, e, q, a, b, flat);
  if (x === 0) return false;
  const y = along2(p, d, e, q, b, c, flat);
  if (!(x > 0 ? y > 0 : y < 0)) return false;
  const z = along2(p, d, e, q, c, a, flat);
  return x > 0 ? z > 0 : z < 0;
}

// src/lib/morph/triangle-tree.ts
import { BufferAttribute as BufferAttribute2, BufferGeometry as BufferGeometry2 } from "three";
import { MeshBVH as MeshBVH2 } from "three-mesh-bvh";
var LEAF_TRIANGLES = 4;
var STACK = 128;
var UNUSED = 4294967295;
var TriangleTree = class {
  /** nodes x 6: lower corner, upper corner. */
  bounds;
  /** Second child of an inner node; -1 for a leaf. */
  right;
  /** Leaf: first place in `order`. */
  first;
  /** Leaf: triangles. */
  count;
  /** Triangle ids, leaf after leaf. */
  order;
  /** order.length x 3: their corners, as indices into `points`. */
  corners;
  /** Vertices in the order in which the leaves first name them (M x 3): neighbours lie side by side, which caches like. */
  points;
  /** M vertex ids of `points`. */
  vertices;
  /** N: index into `points` of each vertex; 0xffffffff for those in none of the triangles. */
  ranks;
  /** N x 3; those of the last refit. */
  positions;
  /** Answer of the last query: triangle id, -1 for none. */
  triangle = -1;
  /** Answer of `closest`: squared distance. */
  square = 0;
  /** Answer of `closest` and `ray`: barycentric weights of the second and the third corner. */
  weightB = 0;
  weightC = 0;
  /** Answer of `ray`: distance in units of the direction. */
  distance = 0;
  stack = new Int32Array(STACK);
  keys = new Float64Array(STACK);
  /**
   * @param positions N x 3; borrowed and kept
   * @param triangles F x 3; borrowed
   * @param subset triangle ids to put in the tree; default all
   */
  constructor(positions, triangles, subset) {
    this.positions = positions;
    let index = triangles;
    if (subset) {
      index = new Uint32Array(3 * subset.length);
      for (let i = 0; i < subset.length; i++) {
        for (let k = 0; k < 3; k++) index[3 * i + k] = triangles[3 * subset[i] + k];
      }
    }
    const geometry2 = new BufferGeometry2();
    geometry2.setAttribute("position", new BufferAttribute2(positions, 3));
    geometry2.setIndex(new BufferAttribute2(index, 1));
    const tree = new MeshBVH2(geometry2, { indirect: true, targetLeafSize: LEAF_TRIANGLES, setBoundingBox: false });
    const faces = index.length / 3;
    const right = [];
    const first = [];
    const count = [];
    const depths = [];
    const open = [];
    tree.traverse((depth, isLeaf, _bounds, offset, size) => {
      const node = right.length;
      right.push(isLeaf ? -1 : 0);
      first.push(isLeaf ? offset : 0);
      count.push(isLeaf ? size : 0);
      depths.push(depth);
      if (depth > 0 && open[depth - 1] !== node - 1) right[open[depth - 1]] = node;
      open[depth] = node;
    });
    this.right = Int32Array.from(right);
    this.first = Uint32Array.from(first);
    this.count = Uint32Array.from(count);
    this.order = new Uint32Array(faces);
    this.corners = new Uint32Array(3 * faces);
    for (let i = 0; i < faces; i++) {
      const t2 = tree.resolveTriangleIndex(i);
      this.order[i] = subset ? subset[t2] : t2;
      for (let k = 0; k < 3; k++) this.corners[3 * i + k] = index[3 * t2 + k];
    }
    this.ranks = new Uint32Array(positions.length / 3).fill(UNUSED);
    const vertices = new Uint32Array(this.ranks.length);
    let used = 0;
    for (let i = 0; i < this.corners.length; i++) {
      const v = this.corners[i];
      if (this.ranks[v] === UNUSED) {
        this.ranks[v] = used;
        vertices[used++] = v;
      }
      this.corners[i] = this.ranks[v];
    }
    this.vertices = vertices.slice(0, used);
    this.points = new Float64Array(3 * used);
    this.bounds = new Float64Array(6 * right.length);
    this.refit(positions);
  }
  /**
   * Fits the boxes to other positions of the same vertices: linear, about a fifth of the time of a new tree, and as good
   * while the vertices move by less than the triangles' spacing or so.
   * @param positions N x 3; borrowed and kept
   */
  refit(positions) {
    this.positions = positions;
    const { bounds, right, first, count, corners, points, vertices } = this;
    for (let i = 0; i < vertices.length; i++) {
      const v = 3 * vertices[i];
      points[3 * i] = positions[v];
      points[3 * i + 1] = positions[v + 1];
      points[3 * i + 2] = positions[v + 2];
    }
    for (let node = right.length - 1; node >= 0; node--) {
      let x0 = Infinity;
      let y0 = Infinity;
      let z0 = Infinity;
      let x1 = -Infinity;
      let y1 = -Infinity;
      let z1 = -Infinity;
      if (right[node] < 0) {
        const end = 3 * (first[node] + count[node]);
        for (let i = 3 * first[node]; i < end; i++) {
          const v = 3 * corners[i];
          const x = points[v];
          const y = points[v + 1];
          const z = points[v + 2];
          if (x < x0) x0 = x;
          if (x > x1) x1 = x;
          if (y < y0) y0 = y;
          if (y > y1) y1 = y;
          if (z < z0) z0 = z;
          if (z > z1) z1 = z;
        }
      } else {
        const a = 6 * (node + 1);
        const b = 6 * right[node];
        x0 = bounds[a] < bounds[b] ? bounds[a] : bounds[b];
        y0 = bounds[a + 1] < bounds[b + 1] ? bounds[a + 1] : bounds[b + 1];
        z0 = bounds[a + 2] < bounds[b + 2] ? bounds[a + 2] : bounds[b + 2];
        x1 = bounds[a + 3] > bounds[b + 3] ? bounds[a + 3] : bounds[b + 3];
        y1 = bounds[a + 4] > bounds[b + 4] ? bounds[a + 4] : bounds[b + 4];
        z1 = bounds[a + 5] > bounds[b + 5] ? bounds[a + 5] : bounds[b + 5];
      }
      const o = 6 * node;
      bounds[o] = x0;
      bounds[o + 1] = y0;
      bounds[o + 2] = z0;
      bounds[o + 3] = x1;
      bounds[o + 4] = y1;
      bounds[o + 5] = z1;
    }
  }
  /** Squared distance of a point to a node's box. */
  boxSquare(node, x, y, z) {
    const b = this.bounds;
    const o = 6 * node;
    let d = 0;
    if (x < b[o]) d = b[o] - x;
    else if (x > b[o + 3]) d = x - b[o + 3];
    let square = d * d;
    d = 0;
    if (y < b[o + 1]) d = b[o + 1] - y;
    else if (y > b[o + 4]) d = y - b[o + 4];
    square += d * d;
    d = 0;
    if (z < b[o + 2]) d = b[o + 2] - z;
    else if (z > b[o + 5]) d = z - b[o + 5];
    return square + d * d;
  }
  /**
   * Triangles whose leaf's box meets a box (x0, y0, z0) to (x1, y1, z1).
   * @param found called with offsets into `corners`; true ends the search
   */
  meeting(x0, y0, z0, x1, y1, z1, found) {
    const { bounds: b, right, first, count, stack } = this;
    let top = 0;
    stack[top++] = 0;
    while (top > 0) {
      const node = stack[--top];
      const o = 6 * node;
      if (b[o] > x1 || b[o + 3] < x0 || b[o + 1] > y1 || b[o + 4] < y0 || b[o + 2] > z1 || b[o + 5] < z0) continue;
      if (right[node] >= 0) {
        stack[top++] = right[node];
        stack[top++] = node + 1;
        continue;
      }
      for (let i = first[node]; i < first[node] + count[node]; i++) if (found(3 * i)) return true;
    }
    return false;
  }
  /**
   * Nearest point of the mesh within a distance: sets triangle, square, weightB, weightC.
   * @param limitSquare only points nearer than its root count
   * @returns whether there is one
   */
  closest(x, y, z, limitSquare) {
    const { right, first, count, corners, order, points: p, stack, keys } = this;
    this.triangle = -1;
    this.square = limitSquare;
    let top = 0;
    let node = 0;
    if (!(this.boxSquare(0, x, y, z) < limitSquare)) return false;
    for (; ; ) {
      if (right[node] >= 0) {
        let near = node + 1;
        let far = right[node];
        let nearKey = this.boxSquare(near, x, y, z);
        let farKey = this.boxSquare(far, x, y, z);
        if (farKey < nearKey) {
          const n = near;
          near = far;
          far = n;
          const k = nearKey;
          nearKey = farKey;
          farKey = k;
        }
        if (nearKey < this.square) {
          if (farKey < this.square) {
            stack[top] = far;
            keys[top++] = farKey;
          }
          node = near;
          continue;
        }
      } else {
        const end = first[node] + count[node];
        for (let i = first[node]; i < end; i++) {
          this.nearer(p, 3 * corners[3 * i], 3 * corners[3 * i + 1], 3 * corners[3 * i + 2], order[i], x, y, z);
        }
      }
      do {
        if (top === 0) return this.triangle >= 0;
        top--;
      } while (!(keys[top] < this.square));
      node = stack[top];
    }
  }
  /** Takes the triangle's nearest point when it is nearer (Ericson, Real-Time Collision Detection, 2005, section 5.1.5). */
  nearer(p, a, b, c, id, x, y, z) {
    const px = x - p[a];
    const py = y - p[a + 1];
    const pz = z - p[a + 2];
    const ux = p[b] - p[a];
    const uy = p[b + 1] - p[a + 1];
    const uz = p[b + 2] - p[a + 2];
    const vx = p[c] - p[a];
    const vy = p[c + 1] - p[a + 1];
    const vz = p[c + 2] - p[a + 2];
    const d1 = ux * px + uy * py + uz * pz;
    const d2 = vx * px + vy * py + vz * pz;
    let s = 0;
    let t2 = 0;
    if (d1 > 0 || d2 > 0) {
      const uu = ux * ux + uy * uy + uz * uz;
      const uv = ux * vx + uy * vy + uz * vz;
      const vv = vx * vx + vy * vy + vz * vz;
      const d3 = d1 - uu;
      const d4 = d2 - uv;
      const d5 = d1 - uv;
      const d6 = d2 - vv;
      const areaC = d1 * d4 - d3 * d2;
      const areaB = d5 * d2 - d1 * d6;
      const areaA = d3 * d6 - d5 * d4;
      if (d3 >= 0 && d4 <= d3) s = 1;
      else if (d6 >= 0 && d5 <= d6) t2 = 1;
      else if (areaC <= 0 && d1 >= 0 && d3 <= 0) s = d1 / uu;
      else if (areaB <= 0 && d2 >= 0 && d6 <= 0) t2 = d2 / vv;
      else if (areaA <= 0 && d4 >= d3 && d5 >= d6) {
        t2 = (d4 - d3) / (d4 - d3 + (d5 - d6));
        s = 1 - t2;
      } else {
        const sum = areaA + areaB + areaC;
        if (sum > 0) {
          s = areaB / sum;
          t2 = areaC / sum;
        }
      }
    }
    const dx = px - s * ux - t2 * vx;
    const dy = py - s * uy - t2 * vy;
    const dz = pz - s * uz - t2 * vz;
    const square = dx * dx + dy * dy + dz * dz;
    if (square < this.square) {
      this.square = square;
      this.triangle = id;
      this.weightB = s;
      this.weightC = t2;
    }
  }
  /**
   * First triangle that a ray leaves the body through (direction . outward normal > 0) at a distance of (0, limit]: sets
   * triangle, distance, weightB, weightC. By Moeller and Trumbore, Journal of Graphics Tools 2, 1997.
   * @param without vertex whose triangles are left out; -1 for none
   * @param limit in units of the direction
   */
  leave(x, y, z, dx, dy, dz, limit, without) {
    const { right, first, count, corners, order, points: p, stack, keys, bounds } = this;
    const own = without < 0 ? UNUSED : this.ranks[without];
    this.triangle = -1;
    this.distance = limit;
    const ix = dx === 0 ? Infinity : 1 / dx;
    const iy = dy === 0 ? Infinity : 1 / dy;
    const iz = dz === 0 ? Infinity : 1 / dz;
    let top = 0;
    stack[top] = 0;
    keys[top++] = 0;
    while (top > 0) {
      top--;
      if (keys[top] > this.distance) continue;
      const node = stack[top];
      if (right[node] < 0) {
        const end = first[node] + count[node];
        for (let i = first[node]; i < end; i++) {
          const va = corners[3 * i];
          const vb = corners[3 * i + 1];
          const vc = corners[3 * i + 2];
          if (va === own || vb === own || vc === own) continue;
          const a = 3 * va;
          const b = 3 * vb;
          const c = 3 * vc;
          const ux = p[b] - p[a];
          const uy = p[b + 1] - p[a + 1];
          const uz = p[b + 2] - p[a + 2];
          const vx = p[c] - p[a];
          const vy = p[c + 1] - p[a + 1];
          const vz = p[c + 2] - p[a + 2];
          const qx = dy * vz - dz * vy;
          const qy = dz * vx - dx * vz;
          const qz = dx * vy - dy * vx;
          const det2 = ux * qx + uy * qy + uz * qz;
          if (!(det2 < 0)) continue;
          const sx = x - p[a];
          const sy = y - p[a + 1];
          const sz = z - p[a + 2];
          const wb = (sx * qx + sy * qy + sz * qz) / det2;
          if (!(wb >= -EDGE && wb <= 1 + EDGE)) continue;
          const rx = sy * uz - sz * uy;
          const ry = sz * ux - sx * uz;
          const rz = sx * uy - sy * ux;
          const wc = (dx * rx + dy * ry + dz * rz) / det2;
          if (!(wc >= -EDGE && wb + wc <= 1 + EDGE)) continue;
          const t2 = (vx * rx + vy * ry + vz * rz) / det2;
          if (t2 > 0 && t2 <= this.distance) {
            this.distance = t2;
            this.triangle = order[i];
            this.weightB = wb;
            this.weightC = wc;
          }
        }
        continue;
      }
      const l = node + 1;
      const r = right[node];
      const lk = enter(bounds, 6 * l, x, y, z, ix, iy, iz, this.distance);
      const rk = enter(bounds, 6 * r, x, y, z, ix, iy, iz, this.distance);
      if (lk <= rk) {
        if (rk < Infinity) {
          stack[top] = r;
          keys[top++] = rk;
        }
        if (lk < Infinity) {
          stack[top] = l;
          keys[top++] = lk;
        }
      } else {
        if (lk < Infinity) {
          stack[top] = l;
          keys[top++] = lk;
        }
        stack[top] = r;
        keys[top++] = rk;
      }
    }
    return this.triangle >= 0;
  }
};
var EDGE = 1e-9;
function enter(b, o, x, y, z, ix, iy, iz, limit) {
  let low = 0;
  let high = limit;
  let s = (b[o] - x) * ix;
  let t2 = (b[o + 3] - x) * ix;
  if (s > t2) {
    const swap = s;
    s = t2;
    t2 = swap;
  }
  if (s > low) low = s;
  if (t2 < high) high = t2;
  s = (b[o + 1] - y) * iy;
  t2 = (b[o + 4] - y) * iy;
  if (s > t2) {
    const swap = s;
    s = t2;
    t2 = swap;
  }
  if (s > low) low = s;
  if (t2 < high) high = t2;
  s = (b[o + 2] - z) * iz;
  t2 = (b[o + 5] - z) * iz;
  if (s > t2) {
    const swap = s;
    s = t2;
    t2 = swap;
  }
  if (s > low) low = s;
  if (t2 < high) high = t2;
  return low <= high * (1 + 4e-16) ? low : Infinity;
}

// src/lib/morph/half-edges.ts
function edgeTable(triangles, vertexCount) {
  const n = triangles.length;
  const start = new Uint32Array(vertexCount + 1);
  const other = (e) => triangles[e % 3 === 2 ? e - 2 : e + 1];
  for (let e = 0; e < n; e++) {
    const a = triangles[e];
    const b = other(e);
    if (a !== b) start[(a < b ? a : b) + 1]++;
  }
  for (let v = 0; v < vertexCount; v++) start[v + 1] += start[v];
  const fill = start.slice(0, vertexCount);
  const list = new Uint32Array(start[vertexCount]);
  for (let e = 0; e < n; e++) {
    const a = triangles[e];
    const b = other(e);
    if (a !== b) list[fill[a < b ? a : b]++] = e;
  }
  const table = {
    opposite: new Int32Array(n).fill(-1),
    open: new Uint8Array(n),
    crowded: new Uint8Array(n),
    against: new Uint8Array(n),
    openCount: 0,
    crowdedCount: 0,
    againstCount: 0
  };
  const upper = (e) => {
    const a = triangles[e];
    const b = other(e);
    return a > b ? a : b;
  };
  for (let v = 0; v < vertexCount; v++) {
    const from = start[v];
    const to = start[v + 1];
    if (to === from) continue;
    sortBy(list, from, to, upper);
    for (let i = from; i < to; ) {
      let j = i + 1;
      const end = upper(list[i]);
      while (j < to && upper(list[j]) === end) j++;
      closeGroup(table, list, i, j, triangles);
      i = j;
    }
  }
  return table;
}
function sortBy(list, from, to, key) {
  if (to - from > 64) {
    list.subarray(from, to).sort((a, b) => key(a) - key(b) || a - b);
    return;
  }
  for (let i = from + 1; i < to; i++) {
    const e = list[i];
    const k = key(e);
    let j = i - 1;
    while (j >= from && key(list[j]) > k) {
      list[j + 1] = list[j];
      j--;
    }
    list[j + 1] = e;
  }
}
function closeGroup(table, list, from, to, triangles) {
  if (to - from === 1) {
    table.open[list[from]] = 1;
    table.openCount++;
  } else if (to - from > 2) {
    for (let i = from; i < to; i++) table.crowded[list[i]] = 1;
    table.crowdedCount++;
  } else {
    const a = list[from];
    const b = list[from + 1];
    table.opposite[a] = b;
    table.opposite[b] = a;
    if (triangles[a] === triangles[b]) {
      table.against[a] = 1;
      table.against[b] = 1;
      table.againstCount++;
    }
  }
}

// src/lib/morph/place-rows.ts
var PlaceRowsBuilder = class {
  places = 0;
  terms = 0;
  starts = new Uint32Array(65);
  vertices = new Uint32Array(64);
  vectors = new Float64Array(192);
  slack = new Float64Array(64);
  values = new Float64Array(64);
  /** One term of the place that the next `place` closes. */
  term(vertex, x, y, z) {
    if (this.terms === this.vertices.length) {
      this.vertices = grown(this.vertices, new Uint32Array(2 * this.terms));
      this.vectors = grown(this.vectors, new Float64Array(6 * this.terms));
    }
    this.vertices[this.terms] = vertex;
    const o = 3 * this.terms++;
    this.vectors[o] = x;
    this.vectors[o + 1] = y;
    this.vectors[o + 2] = z;
  }
  /** Closes a place with the terms since the last one. */
  place(slack, value) {
    if (this.places === this.slack.length) {
      this.slack = grown(this.slack, new Float64Array(2 * this.places));
      this.values = grown(this.values, new Float64Array(2 * this.places));
      this.starts = grown(this.starts, new Uint32Array(2 * this.places + 1));
    }
    this.slack[this.places] = slack;
    this.values[this.places] = value;
    this.starts[++this.places] = this.terms;
  }
  /** The rows, as copies of their exact length. */
  rows() {
    return {
      count: this.places,
      starts: this.starts.slice(0, this.places + 1),
      vertices: this.vertices.slice(0, this.terms),
      vectors: this.vectors.slice(0, 3 * this.terms),
      slack: this.slack.slice(0, this.places),
      values: this.values.slice(0, this.places)
    };
  }
};
function grown(from, to) {
  to.set(from);
  return to;
}

// src/lib/morph/keep-out-cuts.ts
var DEEPEST = 6;
function cutsBetween(p, triangles, chosen, broken, tree, field, sign, sag) {
  const cuts = [];
  const { corners, points: q } = tree;
  for (let i = 0; i < chosen.length; i++) {
    const t2 = 3 * chosen[i];
    if (broken.has(triangles[t2]) || broken.has(triangles[t2 + 1]) || broken.has(triangles[t2 + 2])) continue;
    const a = 3 * triangles[t2];
    const b = 3 * triangles[t2 + 1];
    const c = 3 * triangles[t2 + 2];
    const x0 = Math.min(p[a], p[b], p[c]);
    const y0 = Math.min(p[a + 1], p[b + 1], p[c + 1]);
    const z0 = Math.min(p[a + 2], p[b + 2], p[c + 2]);
    const x1 = Math.max(p[a], p[b], p[c]);
    const y1 = Math.max(p[a + 1], p[b + 1], p[c + 1]);
    const z1 = Math.max(p[a + 2], p[b + 2], p[c + 2]);
    const size = Math.max(x1 - x0, y1 - y0, z1 - z0);
    const crossing = tree.meeting(x0, y0, z0, x1, y1, z1, (o) => {
      const d = 3 * corners[o];
      const e = 3 * corners[o + 1];
      const f = 3 * corners[o + 2];
      return pierces(p, a, b, q, d, e, f, size) || pierces(p, b, c, q, d, e, f, size) || pierces(p, c, a, q, d, e, f, size) || pierces(q, d, e, p, a, b, c, size) || pierces(q, e, f, p, a, b, c, size) || pierces(q, f, d, p, a, b, c, size);
    });
    if (!crossing) continue;
    const deepest = deepestPoint(p, a, b, c, field, sign);
    if (deepest.distance < -sag) cuts.push({ triangle: chosen[i], ...deepest });
  }
  return cuts;
}
function deepestPoint(p, a, b, c, field, sign) {
  const corner = (o) => [p[o], p[o + 1], p[o + 2]];
  const best = { distance: Infinity, position: corner(a) };
  const stack = [
    [corner(a), corner(b), corner(c), 0]
  ];
  const middle = (u, v) => [
    (u[0] + v[0]) / 2,
    (u[1] + v[1]) / 2,
    (u[2] + v[2]) / 2
  ];
  for (let top = stack.pop(); top; top = stack.pop()) {
    const [u, v, w, depth] = top;
    const centre = [0, 1, 2].map((d) => (u[d] + v[d] + w[d]) / 3);
    field.at(centre[0], centre[1], centre[2], -Infinity, Infinity);
    const distance = sign * field.distance;
    if (distance < best.distance) Object.assign(best, { distance, position: centre });
    const radius = Math.max(...[u, v, w].map((x) => Math.hypot(x[0] - centre[0], x[1] - centre[1], x[2] - centre[2])));
    if (depth === DEEPEST || distance - radius >= best.distance) continue;
    const [uv, vw, wu] = [middle(u, v), middle(v, w), middle(w, u)];
    stack.push([u, uv, wu, depth + 1], [uv, v, vw, depth + 1], [wu, vw, w, depth + 1], [uv, vw, wu, depth + 1]);
  }
  return best;
}

// src/lib/morph/signed-distance.ts
var CORNER = 1e-9;
var GRID = 64;
var MARGIN = 0.125;
var SignedDistance = class {
  /**
   * @param positions N x 3, metres; borrowed and kept
   * @param triangles F x 3, outward; borrowed and kept
   * @throws MorphError keep-out-open, keep-out-invalid, mesh-shape, mesh-non-finite
   */
  constructor(positions, triangles) {
    this.positions = positions;
    this.triangles = triangles;
    if (triangles.length === 0) {
      throw new MorphError("keep-out-invalid", "The keep-out mesh has no triangles.", "Upload a closed mesh.");
    }
    checkMesh(positions, triangles);
    const edges = edgeTable(triangles, positions.length / 3);
    if (edges.openCount > 0) {
      const triangle = Math.floor(edges.open.indexOf(1) / 3);
      throw new MorphError(
        "keep-out-open",
        `The keep-out mesh is open: ${edges.openCount} edges belong to one triangle only, the first of them in triangle ${triangle}.`,
        "Close its holes, or draw a box or a half-space instead.",
        { triangle }
      );
    }
    if (edges.crowdedCount > 0 || edges.againstCount > 0) {
      const triangle = Math.floor((edges.crowdedCount > 0 ? edges.crowded : edges.against).indexOf(1) / 3);
      throw new MorphError(
        "keep-out-invalid",
        edges.crowdedCount > 0 ? `${edges.crowdedCount} edges of the keep-out mesh belong to more than two triangles, the first of them in triangle ${triangle}.` : `${edges.againstCount} edges of the keep-out mesh join triangles of opposite orientation, the first of them in triangle ${triangle}.`,
        edges.crowdedCount > 0 ? "Separate the bodies that touch along an edge, or upload them one by one." : "Orient all triangles alike, counter-clockwise seen from outside.",
        { triangle }
      );
    }
    if (!(volumeOf(positions, triangles, boundsCentre(positions)) > 0)) {
      throw new MorphError(
        "keep-out-invalid",
        "The keep-out mesh encloses no volume: its triangles look inward, or it is flat.",
        "Turn all its triangles round, so that they are counter-clockwise seen from outside."
      );
    }
    this.opposite = edges.opposite;
    const { face, vertex } = pseudonormals(positions, triangles);
    this.faceNormals = face;
    this.vertexNormals = vertex;
    this.tree = new TriangleTree(positions, triangles);
    const b = this.tree.bounds;
    const longest2 = Math.max(b[3] - b[0], b[4] - b[1], b[5] - b[2]);
    const margin = MARGIN * longest2;
    this.cell = (longest2 + 2 * margin) / GRID;
    this.origin = [b[0] - margin, b[1] - margin, b[2] - margin];
    this.size = [0, 1, 2].map((d) => Math.max(1, Math.ceil((b[3 + d] - b[d] + 2 * margin) / this.cell)));
    this.grid = new Float64Array(this.size[0] * this.size[1] * this.size[2]).fill(NaN);
  }
  positions;
  triangles;
  tree;
  faceNormals;
  vertexNormals;
  opposite;
  origin;
  cell;
  size;
  grid;
  /** Answer of the last `at`: the distance (metres, signed), its gradient (unit). */
  distance = 0;
  gx = 0;
  gy = 0;
  gz = 0;
  /** Exact distance of a point whose nearest point lies within `reach`; sets the answer, or returns false. */
  query(x, y, z, reach) {
    const { tree } = this;
    if (!tree.closest(x, y, z, reach * reach)) return false;
    const t2 = 3 * tree.triangle;
    const wb = tree.weightB;
    const wc = tree.weightC;
    const wa = 1 - wb - wc;
    const p = this.positions;
    const [a, b, c] = [this.triangles[t2], this.triangles[t2 + 1], this.triangles[t2 + 2]];
    const dx = x - (wa * p[3 * a] + wb * p[3 * b] + wc * p[3 * c]);
    const dy = y - (wa * p[3 * a + 1] + wb * p[3 * b + 1] + wc * p[3 * c + 1]);
    const dz = z - (wa * p[3 * a + 2] + wb * p[3 * b + 2] + wc * p[3 * c + 2]);
    let nx;
    let ny;
    let nz;
    const f = this.faceNormals;
    const corner = wa >= 1 - CORNER ? a : wb >= 1 - CORNER ? b : wc >= 1 - CORNER ? c : -1;
    if (corner >= 0) {
      nx = this.vertexNormals[3 * corner];
      ny = this.vertexNormals[3 * corner + 1];
      nz = this.vertexNormals[3 * corner + 2];
    } else {
      const edge = wc <= CORNER ? 0 : wa <= CORNER ? 1 : wb <= CORNER ? 2 : -1;
      nx = f[t2];
      ny = f[t2 + 1];
      nz = f[t2 + 2];
      if (edge >= 0) {
        const o = this.opposite[t2 + edge];
        const other = 3 * Math.floor(o / 3);
        nx += f[other];
        ny += f[other + 1];
        nz += f[other + 2];
      }
    }
    const sign = dx * nx + dy * ny + dz * nz >= 0 ? 1 : -1;
    const d = Math.sqrt(tree.square);
    this.distance = sign * d;
    if (d > 1e-12 * this.cell) {
      this.gx = dx / this.distance;
      this.gy = dy / this.distance;
      this.gz = dz / this.distance;
    } else {
      const n = Math.sqrt(nx * nx + ny * ny + nz * nz) || 1;
      this.gx = nx / n;
      this.gy = ny / n;
      this.gz = nz / n;
    }
    return true;
  }
  /**
   * Signed distance and gradient at a point where the distance lies in [low, high]; beyond, the gradient is (0, 0, 0) and
   * the distance an infinity of the right sign, where that answer is the cheaper one.
   */
  at(x, y, z, low, high) {
    const [ox, oy, oz] = this.origin;
    const [sx, sy, sz] = this.size;
    const { cell: cell2 } = this;
    const i = Math.floor((x - ox) / cell2);
    const j = Math.floor((y - oy) / cell2);
    const k = Math.floor((z - oz) / cell2);
    if (i < 0 || j < 0 || k < 0 || i >= sx || j >= sy || k >= sz) {
      if (!this.query(x, y, z, high)) this.beyond(Infinity);
      return;
    }
    const at = (i * sy + j) * sz + k;
    const [cx, cy, cz] = [ox + (i + 0.5) * cell2, oy + (j + 0.5) * cell2, oz + (k + 0.5) * cell2];
    let centre = this.grid[at];
    if (Number.isNaN(centre)) {
      this.query(cx, cy, cz, Infinity);
      centre = this.grid[at] = this.distance;
    }
    const way = Math.sqrt((x - cx) ** 2 + (y - cy) ** 2 + (z - cz) ** 2);
    if (centre - way > high) return this.beyond(Infinity);
    if (centre + way < low) return this.beyond(-Infinity);
    this.query(x, y, z, (Math.abs(centre) + way) * (1 + 1e-9) + 1e-12 * cell2);
  }
  beyond(distance) {
    this.distance = distance;
    this.gx = this.gy = this.gz = 0;
  }
  /** The tree over the mesh's triangles, for those who look for crossings. */
  get triangleTree() {
    return this.tree;
  }
};
function pseudonormals(p, triangles) {
  const face = new Float64Array(triangles.length);
  const vertex = new Float64Array(p.length);
  for (let t2 = 0; t2 < triangles.length; t2 += 3) {
    const n = [0, 0, 0];
    const e = [];
    for (let k = 0; k < 3; k++) {
      const a = 3 * triangles[t2 + k];
      const b = 3 * triangles[t2 + (k + 1) % 3];
      e.push([p[b] - p[a], p[b + 1] - p[a + 1], p[b + 2] - p[a + 2]]);
    }
    n[0] = e[2][1] * e[0][2] - e[2][2] * e[0][1];
    n[1] = e[2][2] * e[0][0] - e[2][0] * e[0][2];
    n[2] = e[2][0] * e[0][1] - e[2][1] * e[0][0];
    const length = Math.hypot(n[0], n[1], n[2]);
    if (length === 0) continue;
    for (let d = 0; d < 3; d++) face[t2 + d] = n[d] / length;
    for (let k = 0; k < 3; k++) {
      const u = e[k];
      const w = e[(k + 2) % 3];
      const angle = Math.atan2(length, -(u[0] * w[0] + u[1] * w[1] + u[2] * w[2]));
      const v = 3 * triangles[t2 + k];
      for (let d = 0; d < 3; d++) vertex[v + d] += angle * face[t2 + d];
    }
  }
  return { face, vertex };
}

// src/lib/morph/keep-out.ts
var HalfSpaceField = class {
  distance = 0;
  gx;
  gy;
  gz;
  offset;
  constructor(geometry2) {
    [this.gx, this.gy, this.gz] = geometry2.normal;
    const p = geometry2.point;
    this.offset = this.gx * p[0] + this.gy * p[1] + this.gz * p[2];
  }
  at(x, y, z) {
    this.distance = this.gx * x + this.gy * y + this.gz * z - this.offset;
  }
};
var BoxField = class {
  constructor(geometry2) {
    this.geometry = geometry2;
    this.m = boxAxes(geometry2);
  }
  geometry;
  distance = 0;
  gx = 0;
  gy = 0;
  gz = 0;
  /** Rows: the box's axes in the world. */
  m;
  at(x, y, z) {
    const { m: m2 } = this;
    const { centre, halfSize } = this.geometry;
    const rx = x - centre[0];
    const ry = y - centre[1];
    const rz = z - centre[2];
    const u = m2[0] * rx + m2[1] * ry + m2[2] * rz;
    const v = m2[3] * rx + m2[4] * ry + m2[5] * rz;
    const w = m2[6] * rx + m2[7] * ry + m2[8] * rz;
    const a = Math.abs(u) - halfSize[0];
    const b = Math.abs(v) - halfSize[1];
    const c = Math.abs(w) - halfSize[2];
    let du = 0;
    let dv = 0;
    let dw = 0;
    if (a > 0 || b > 0 || c > 0) {
      if (a > 0) du = u < 0 ? -a : a;
      if (b > 0) dv = v < 0 ? -b : b;
      if (c > 0) dw = w < 0 ? -c : c;
      const d = Math.sqrt(du * du + dv * dv + dw * dw);
      this.distance = d;
      du /= d;
      dv /= d;
      dw /= d;
    } else if (a >= b && a >= c) {
      this.distance = a;
      du = u < 0 ? -1 : 1;
    } else if (b >= c) {
      this.distance = b;
      dv = v < 0 ? -1 : 1;
    } else {
      this.distance = c;
      dw = w < 0 ? -1 : 1;
    }
    this.gx = m2[0] * du + m2[3] * dv + m2[6] * dw;
    this.gy = m2[1] * du + m2[4] * dv + m2[7] * dw;
    this.gz = m2[2] * du + m2[5] * dv + m2[8] * dw;
  }
};
var UNIT = 1e-6;
function refuse(message, mend) {
  throw new MorphError("keep-out-invalid", message, mend);
}
function checkNumbers(name, values, length) {
  if (values.length !== length || !values.every(Number.isFinite)) {
    refuse(`The keep-out's ${name} is not a list of ${length} finite numbers.`, `Give ${length} finite numbers.`);
  }
}
function fieldOf(geometry2) {
  if (geometry2.kind === "halfSpace") {
    checkNumbers("point", geometry2.point, 3);
    checkNumbers("normal", geometry2.normal, 3);
    const length = Math.hypot(...geometry2.normal);
    if (Math.abs(length - 1) > UNIT) {
      refuse(
        `The half-space's normal has the length ${length.toPrecision(6)}.`,
        "Give a unit vector that points out of the half."
      );
    }
    return new HalfSpaceField(geometry2);
  }
  if (geometry2.kind === "box") {
    checkNumbers("centre", geometry2.centre, 3);
    checkNumbers("half-size", geometry2.halfSize, 3);
    checkNumbers("rotation", geometry2.rotation, 4);
    if (!geometry2.halfSize.every((h) => h > 0)) {
      refuse("A half-size of the keep-out box is not positive.", "Give half-sizes above 0.");
    }
    const length = Math.hypot(...geometry2.rotation);
    if (Math.abs(length - 1) > UNIT) {
      refuse(`The rotation has the length ${length.toPrecision(6)}.`, "Give a unit quaternion [x, y, z, w].");
    }
    return new BoxField(geometry2);
  }
  if (geometry2.kind === "mesh") return new SignedDistance(geometry2.positions, geometry2.triangles);
  return refuse(
    `Keep-outs of the kind "${String(geometry2.kind)}" are not known.`,
    "Use halfSpace, box or mesh."
  );
}
function prepareKeepOut(geometry2, side2, clearance) {
  if (!Number.isFinite(clearance) || clearance < 0) {
    refuse(`The clearance ${clearance} is no length.`, "Give 0 or more metres.");
  }
  if (side2 !== "outside" && side2 !== "inside") {
    refuse(`The side "${String(side2)}" is not known.`, "Use outside or inside.");
  }
  return new KeepOut(geometry2, side2, clearance, fieldOf(geometry2));
}
var KeepOut = class {
  constructor(geometry2, side2, clearance, field) {
    this.geometry = geometry2;
    this.side = side2;
    this.clearance = clearance;
    this.field = field;
  }
  geometry;
  side;
  clearance;
  field;
  distance(points, n, limit, outDistance, outGradient) {
    const { field } = this;
    const sign = this.side === "outside" ? 1 : -1;
    const low = sign > 0 ? -Infinity : -limit;
    const high = sign > 0 ? limit : Infinity;
    for (let i = 0; i < n; i++) {
      field.at(points[3 * i], points[3 * i + 1], points[3 * i + 2], low, high);
      const d = sign * field.distance;
      const beyond = d > limit;
      outDistance[i] = beyond ? limit : d;
      outGradient[3 * i] = beyond ? 0 : sign * field.gx;
      outGradient[3 * i + 1] = beyond ? 0 : sign * field.gy;
      outGradient[3 * i + 2] = beyond ? 0 : sign * field.gz;
    }
  }
  place(vertices) {
    const { field, clearance } = this;
    const sign = this.side === "outside" ? 1 : -1;
    return {
      rows: (positions, within) => {
        const builder = new PlaceRowsBuilder();
        const limit = clearance + within;
        const low = sign > 0 ? -Infinity : -limit;
        const high = sign > 0 ? limit : Infinity;
        for (let i = 0; i < vertices.length; i++) {
          const v = 3 * vertices[i];
          field.at(positions[v], positions[v + 1], positions[v + 2], low, high);
          const d = sign * field.distance;
          if (!(d < limit)) continue;
          builder.term(vertices[i], sign * field.gx, sign * field.gy, sign * field.gz);
          builder.place(d - clearance, d);
        }
        return builder.rows();
      }
    };
  }
  /** The geometry's surface, where a triangle with all its vertices on the right side can still cut it. */
  surfaceTree() {
    const { geometry: geometry2, field } = this;
    if (field instanceof SignedDistance) return field.triangleTree;
    if (geometry2.kind !== "box" || this.side === "inside") return null;
    return boxTree(geometry2);
  }
  penetration(positions, triangles, chosen, tolerance, sag) {
    const { vertices, holder, size } = verticesOf(positions, triangles, chosen);
    const result = { distance: null, position: null, triangle: -1, vertices: 0, cuts: 0 };
    const constraint = this.place(vertices);
    let rows = constraint.rows(positions, tolerance);
    for (let within = size / 64; rows.count === 0 && within < 1e3 * size; within *= 8) {
      rows = constraint.rows(positions, within);
    }
    const broken = /* @__PURE__ */ new Set();
    for (let k = 0; k < rows.count; k++) {
      if (rows.slack[k] < -tolerance) broken.add(rows.vertices[k]);
      if (result.distance !== null && rows.values[k] >= result.distance) continue;
      const v = rows.vertices[k];
      result.distance = rows.values[k];
      result.triangle = holder[v];
      result.position = [positions[3 * v], positions[3 * v + 1], positions[3 * v + 2]];
    }
    result.vertices = broken.size;
    const tree = this.surfaceTree();
    if (tree) {
      const sign = this.side === "outside" ? 1 : -1;
      for (const cut of cutsBetween(positions, triangles, chosen, broken, tree, this.field, sign, sag)) {
        result.cuts++;
        if (result.distance !== null && cut.distance >= result.distance) continue;
        result.distance = cut.distance;
        result.position = cut.position;
        result.triangle = cut.triangle;
      }
    }
    return result;
  }
};
function verticesOf(positions, triangles, chosen) {
  const holder = new Int32Array(positions.length / 3).fill(-1);
  let count = 0;
  for (let i = 0; i < chosen.length; i++) {
    for (let k = 0; k < 3; k++) {
      const v = triangles[3 * chosen[i] + k];
      if (holder[v] < 0) count++;
      holder[v] = chosen[i];
    }
  }
  const vertices = new Uint32Array(count);
  const low = [Infinity, Infinity, Infinity];
  const high = [-Infinity, -Infinity, -Infinity];
  let at = 0;
  for (let v = 0; v < holder.length; v++) {
    if (holder[v] < 0) continue;
    vertices[at++] = v;
    for (let d = 0; d < 3; d++) {
      low[d] = Math.min(low[d], positions[3 * v + d]);
      high[d] = Math.max(high[d], positions[3 * v + d]);
    }
  }
  const size = count > 0 ? Math.hypot(high[0] - low[0], high[1] - low[1], high[2] - low[2]) : 1;
  return { vertices, holder, size: size || 1 };
}
function boxTree(geometry2) {
  const m2 = boxAxes(geometry2);
  const positions = new Float64Array(24);
  for (let i = 0; i < 8; i++) {
    for (let d = 0; d < 3; d++) {
      positions[3 * i + d] = geometry2.centre[d];
      for (let k = 0; k < 3; k++) positions[3 * i + d] += (i >> k & 1 ? 1 : -1) * geometry2.halfSize[k] * m2[3 * k + d];
    }
  }
  const faces = [];
  for (let d = 0; d < 3; d++) {
    const [u, v, w] = [1 << d, 1 << (d + 1) % 3, 1 << (d + 2) % 3];
    faces.push(0, v + w, v, 0, w, v + w, u, u + v, u + v + w, u, u + v + w, u + w);
  }
  return new TriangleTree(positions, Uint32Array.from(faces));
}

// bench/workload.ts
var BOX = {
  id: "standard",
  centre: [1.3, 0, 0.1],
  halfSize: [1.2, 1, 0.9],
  rotation: [0, 0, 0, 1],
  lattice: [7, 7, 7],
  basis: "bernstein",
  held: { u0: 2, u1: 0, v0: 0, v1: 0, w0: 0, w1: 0 },
  axes: ["x", "y", "z"],
  frame: "box"
};
var T = (1 + Math.sqrt(5)) / 2;
var CORNERS = [
  [-1, T, 0],
  [1, T, 0],
  [-1, -T, 0],
  [1, -T, 0],
  [0, -1, T],
  [0, 1, T],
  [0, -1, -T],
  [0, 1, -T],
  [T, 0, -1],
  [T, 0, 1],
  [-T, 0, -1],
  [-T, 0, 1]
];
var FACES2 = [
  0,
  11,
  5,
  0,
  5,
  1,
  0,
  1,
  7,
  0,
  7,
  10,
  0,
  10,
  11,
  1,
  5,
  9,
  5,
  11,
  4,
  11,
  10,
  2,
  10,
  7,
  6,
  7,
  1,
  8,
  3,
  9,
  4,
  3,
  4,
  2,
  3,
  2,
  6,
  3,
  6,
  8,
  3,
  8,
  9,
  4,
  9,
  5,
  2,
  4,
  11,
  6,
  2,
  10,
  8,
  6,
  7,
  9,
  8,
  1
];
function icosphere(level) {
  const size = 10 * 4 ** level + 2;
  const positions = new Float64Array(3 * size);
  CORNERS.forEach(
    (c, i) => positions.set(
      c.map((x) => x / Math.hypot(...c)),
      3 * i
    )
  );
  let count = CORNERS.length;
  let triangles = Uint32Array.from(FACES2);
  for (let l = 0; l < level; l++) {
    const faces = triangles.length / 3;
    const middles = /* @__PURE__ */ new Map();
    const middle = (a, b) => {
      const key = Math.min(a, b) * size + Math.max(a, b);
      let m2 = middles.get(key);
      if (m2 === void 0) {
        m2 = count++;
        let length = 0;
        for (let d = 0; d < 3; d++) {
          const x = positions[3 * a + d] + positions[3 * b + d];
          positions[3 * m2 + d] = x;
          length += x * x;
        }
        for (let d = 0; d < 3; d++) positions[3 * m2 + d] /= Math.sqrt(length);
        middles.set(key, m2);
      }
      return m2;
    };
    const next = new Uint32Array(12 * faces);
    for (let t2 = 0; t2 < faces; t2++) {
      const [p, q, r] = [triangles[3 * t2], triangles[3 * t2 + 1], triangles[3 * t2 + 2]];
      const [a, b, c] = [middle(p, q), middle(q, r), middle(r, p)];
      next.set([p, a, c], 3 * t2);
      next.set([q, b, a], 3 * (faces + t2));
      next.set([r, c, b], 3 * (2 * faces + t2));
      next.set([a, b, c], 3 * (3 * faces + t2));
    }
    triangles = next;
  }
  return { positions, triangles };
}

// tests/unit/morph/shapes.ts
function ellipsoid(level, axes) {
  const { positions, triangles } = icosphere(level);
  return makeSurface(
    positions.map((x, i) => x * axes[i % 3]),
    triangles
  );
}
function smoothGradient(surface2, k = 3) {
  const out = new Float64Array(surface2.positions.length);
  for (let v = 0; v < surface2.mass.length; v++) {
    const [x, y, z] = surface2.positions.subarray(3 * v, 3 * v + 3);
    const s = surface2.mass[v] * (Math.cos(k * x) * Math.sin(2 * y + 0.4) + 0.3 * z);
    for (let d = 0; d < 3; d++) out[3 * v + d] = s * surface2.normals[3 * v + d];
  }
  return out;
}

// ../n1-prof.ts
var surface = ellipsoid(5, [2.4, 0.9, 0.7]);
var gradient = smoothGradient(surface);
var prepared = prepareMove(surface, [BOX], { smoothing: 0.05 });
for (const b of [9e-3, 8e-3, 5e-3]) {
  const t2 = performance.now();
  try {
    const m2 = prepared.solve({ objectives: [{ id: "a", gradient, sense: "minimise", weight: 1 }], step: 0.01, constraints: [{ kind: "volume", bound: "hold" }, { kind: "displacement", inward: b, outward: b }] });
    console.log(b, prepared.moved.length, ((performance.now() - t2) / 1e3).toFixed(2), m2.constraints.map((c) => c.places));
  } catch (e) {
    console.log(b, ((performance.now() - t2) / 1e3).toFixed(2), e.message);
  }
}
var src = prepareKeepOut({ kind: "halfSpace", point: [0, 0, 0.705], normal: [0, 0, -1] }, "outside", 0);
var t = performance.now();
var m = prepared.solve({ objectives: [{ id: "a", gradient, sense: "minimise", weight: 1 }], step: 0.02, constraints: [{ kind: "volume", bound: "hold" }, { kind: "keepOut", label: "k", limit: 0, source: src }] });
console.log("keepout", ((performance.now() - t) / 1e3).toFixed(2), m.constraints.map((c) => c.places));
