import {
	BufferAttribute,
	BufferGeometry,
	Color,
	GreaterDepth,
	Group,
	LineBasicMaterial,
	LineSegments,
	Points,
	ShaderMaterial,
	SRGBColorSpace
} from 'three';
import { boxPoint, heldPoints, restPoints } from '$lib/state/bench-geometry';
import type { Box } from '$lib/api/schemas/drawn';
import type { Vec3 } from '$lib/workers/display-protocol';
import type { Palette } from './palette';

/** A design box to be drawn. */
export interface BoxDrawing {
	box: Box;
	selected: boolean;
	/** Taken into the next move. */
	used: boolean;
	/** What was moved by hand, nPoints x 3 metres, drawn so many times as large. */
	hand?: { displacement: number[]; factor: number } | null;
	/** Chosen control points. */
	chosen?: number[];
}

const POINT_PX = 7;
const corners: Vec3[] = [0, 1, 2, 3, 4, 5, 6, 7].map((c) => [c & 4 ? 1 : -1, c & 2 ? 1 : -1, c & 1 ? 1 : -1]);
const edges = [0, 1, 2, 3, 4, 5, 6, 7].flatMap((c) =>
	[1, 2, 4].filter((bit) => !(c & bit)).map((bit) => [c, c | bit] as const)
);

/** Squares in screen pixels; a held point is hollow. */
const pointShader = {
	vertexShader: /* glsl */ `
		attribute float held;
		uniform float uSize;
		varying float vHeld;
		void main() {
			vHeld = held;
			gl_Position = projectionMatrix * modelViewMatrix * vec4(position, 1.0);
			gl_PointSize = held > 1.5 ? 1.7 * uSize : uSize;
		}
	`,
	fragmentShader: /* glsl */ `
		precision highp float;
		uniform vec3 uInk, uGround, uChosen;
		uniform float uAlpha, uSize;
		varying float vHeld;
		void main() {
			vec2 d = abs(gl_PointCoord - 0.5) * uSize;
			float side = max(d.x, d.y);
			float half_ = 0.5 * uSize;
			if (vHeld > 1.5) {
				gl_FragColor = vec4(vHeld > 2.5 ? mix(uGround, uChosen, step(0.3 * uSize, side)) : uChosen, uAlpha);
				return;
			}
			if (vHeld > 0.5) {
				if (side > 0.5 * uSize - 0.2) discard;
				gl_FragColor = vec4(mix(uGround, uInk, step(half_ - 0.24 * uSize, side)), uAlpha);
			} else {
				if (side > half_ - 0.16 * uSize) discard;
				gl_FragColor = vec4(uInk, uAlpha);
			}
		}
	`
};

/** Wire and lattice of one design box. Behind the surface it is drawn faintly instead of not at all. */
export class Cage {
	readonly group = new Group();
	readonly #edges = new BufferGeometry();
	readonly #lattice = new BufferGeometry();
	readonly #points = new BufferGeometry();
	readonly #edgeMaterials: LineBasicMaterial[];
	readonly #latticeMaterials: LineBasicMaterial[];
	readonly #pointMaterials: ShaderMaterial[];
	readonly #selectedParts: (LineSegments | Points)[];

	constructor() {
		const lines = (depthBehind: boolean) =>
			new LineBasicMaterial({
				transparent: true,
				depthWrite: false,
				...(depthBehind ? { depthFunc: GreaterDepth } : {})
			});
		const points = (depthBehind: boolean) =>
			new ShaderMaterial({
				...pointShader,
				transparent: true,
				depthWrite: false,
				...(depthBehind ? { depthFunc: GreaterDepth } : {}),
				uniforms: {
					uInk: { value: new Color() },
					uGround: { value: new Color() },
					uChosen: { value: new Color() },
					uAlpha: { value: depthBehind ? 0.22 : 1 },
					uSize: { value: POINT_PX }
				}
			});
		this.#edgeMaterials = [lines(false), lines(true)];
		this.#latticeMaterials = [lines(false), lines(true)];
		this.#pointMaterials = [points(false), points(true)];
		const edgeParts = this.#edgeMaterials.map((m) => new LineSegments(this.#edges, m));
		const latticeParts = this.#latticeMaterials.map((m) => new LineSegments(this.#lattice, m));
		const pointParts = this.#pointMaterials.map((m) => new Points(this.#points, m));
		this.#selectedParts = [...latticeParts, ...pointParts];
		for (const part of [...edgeParts, ...this.#selectedParts]) {
			part.frustumCulled = false;
			part.renderOrder = part instanceof Points ? 4 : 3;
			this.group.add(part);
		}
	}

	draw({ box, selected, used, hand, chosen }: BoxDrawing, palette: Palette, pixelRatio: number) {
		const at = corners.map((c) => boxPoint(box, c));
		this.#edges.setAttribute('position', floats(edges.flatMap(([a, b]) => [...at[a], ...at[b]])));
		for (const part of this.#selectedParts) part.visible = selected;
		if (selected) {
			const place = restPoints(box);
			hand?.displacement.forEach((x, i) => (place[i] += hand.factor * x));
			const held = heldPoints(box.lattice, box.held);
			for (const p of box.heldPoints ?? []) held[p] = 1;
			const marks = Float32Array.from(held);
			for (const p of chosen ?? []) marks[p] += 2;
			this.#points.setAttribute('position', new BufferAttribute(place, 3));
			this.#points.setAttribute('held', new BufferAttribute(marks, 1));
			this.#lattice.setAttribute('position', new BufferAttribute(latticeLines(box.lattice, place), 3));
		}
		const strength = selected ? 0.85 : used ? 0.45 : 0.22;
		paint(this.#edgeMaterials, palette.ink, [strength, strength * 0.3]);
		paint(this.#latticeMaterials, palette.ink, [0.3, 0.07]);
		for (const m of this.#pointMaterials) {
			(m.uniforms.uInk.value as Color).copy(palette.ink);
			(m.uniforms.uGround.value as Color).copy(palette.ground);
			(m.uniforms.uChosen.value as Color).copy(palette.copper);
			m.uniforms.uSize.value = POINT_PX * pixelRatio;
		}
	}

	dispose() {
		for (const g of [this.#edges, this.#lattice, this.#points]) g.dispose();
		for (const m of [...this.#edgeMaterials, ...this.#latticeMaterials, ...this.#pointMaterials]) m.dispose();
	}
}

const floats = (values: number[]) => new BufferAttribute(new Float32Array(values), 3);

function paint(materials: LineBasicMaterial[], ink: Color, [front, behind]: [number, number]) {
	// Line materials convert from linear light on their way out; ours is written as it is.
	const colour = new Color().setRGB(ink.r, ink.g, ink.b, SRGBColorSpace);
	materials.forEach((m, i) => {
		m.color.copy(colour);
		m.opacity = i === 0 ? front : behind;
	});
}

/** Segments between neighbours on the six faces of the lattice: inside they would only hide what is behind. */
function latticeLines([nu, nv, nw]: readonly number[], points: Float32Array): Float32Array {
	const out: number[] = [];
	const index = (i: number, j: number, k: number) => ((i * nv + j) * nw + k) * 3;
	const rim = (i: number, n: number) => i === 0 || i === n - 1;
	const link = (a: number, b: number) => {
		for (const p of [a, b]) out.push(points[p], points[p + 1], points[p + 2]);
	};
	for (let i = 0; i < nu; i++)
		for (let j = 0; j < nv; j++)
			for (let k = 0; k < nw; k++) {
				if (i + 1 < nu && (rim(j, nv) || rim(k, nw))) link(index(i, j, k), index(i + 1, j, k));
				if (j + 1 < nv && (rim(i, nu) || rim(k, nw))) link(index(i, j, k), index(i, j + 1, k));
				if (k + 1 < nw && (rim(i, nu) || rim(j, nv))) link(index(i, j, k), index(i, j, k + 1));
			}
	return new Float32Array(out);
}
