import { BufferAttribute, BufferGeometry, Color, DoubleSide, Matrix4, Mesh, ShaderMaterial, Vector4 } from 'three';
import type { DisplayMesh, Vec3 } from '$lib/workers/display-protocol';
import type { Palette } from './palette';

/** Boxes whose outline the surface can carry at once. */
export const MAX_BOXES = 12;

const vertexShader = /* glsl */ `
	attribute vec3 rest;
	attribute float field;
	attribute float level;
	varying vec3 vNormal;
	varying vec3 vEye;
	varying vec3 vRest;
	varying vec3 vPlace;
	varying float vField;
	varying float vLevel;
	void main() {
		vec4 eye = modelViewMatrix * vec4(position, 1.0);
		vNormal = normalMatrix * normal;
		vEye = isOrthographic ? vec3(0.0, 0.0, 1.0) : -eye.xyz;
		vRest = rest;
		vPlace = position;
		vField = field;
		vLevel = level;
		gl_Position = projectionMatrix * eye;
	}
`;

const fragmentShader = /* glsl */ `
	precision highp float;
	uniform vec3 uInk, uLine, uPlain, uZero, uCopper, uVerdigris;
	uniform vec2 uShade;
	uniform float uLimit, uInterval, uDim;
	uniform mat4 uBoxes[${MAX_BOXES}];
	uniform int uBoxCount, uSelected;
	uniform vec4 uRing;
	varying vec3 vNormal;
	varying vec3 vEye;
	varying vec3 vRest;
	varying vec3 vPlace;
	varying float vField;
	varying float vLevel;

	// 1 on the line d = 0 of a distance whose pixel size is w, 'width' pixels wide.
	float line(float d, float w, float width) {
		return 1.0 - smoothstep(0.5 * width, 0.5 * width + 1.0, abs(d) / max(w, 1e-12));
	}

	void main() {
		vec3 n = normalize(vNormal) * (gl_FrontFacing ? 1.0 : -1.0);
		vec3 eye = normalize(vEye);
		vec3 colour = uPlain;
		float contour = 0.0;
		if (uLimit > 0.0) {
			float t = clamp(vField / uLimit, -1.0, 1.0);
			colour = mix(uZero, t < 0.0 ? uVerdigris : uCopper, pow(abs(t), 0.85));
			float c = vLevel / uInterval;
			float w = fwidth(c);
			// Lines of equal value, none at zero where noise would draw its own, none where they would run together.
			float level = round(c);
			if (abs(level) > 0.5 && abs(vLevel) < uLimit * 1.02)
				contour = line(c - level, w, 0.6) * (1.0 - smoothstep(0.22, 0.45, w));
		}
		if (!gl_FrontFacing) { colour = mix(uPlain, uInk, 0.45); contour = 0.0; }

		float inside = 0.0, edge = 0.0;
		for (int i = 0; i < ${MAX_BOXES}; i++) {
			if (i >= uBoxCount) break;
			vec3 p = abs((uBoxes[i] * vec4(vRest, 1.0)).xyz);
			float d = max(p.x, max(p.y, p.z)) - 1.0;
			float here = line(d, fwidth(d), i == uSelected ? 0.9 : 0.3);
			edge = max(edge, i == uSelected ? here : 0.45 * here);
			if (i == uSelected && d <= 0.0) inside = 1.0;
		}

		float grey = dot(colour, vec3(0.30, 0.59, 0.11));
		float away = uSelected >= 0 ? uDim * (1.0 - inside) : 0.0;
		colour = mix(colour, mix(vec3(grey), uPlain, 0.5), away);
		contour *= 1.0 - 0.6 * away;

		// A soft key from above the eye's left shoulder, a sky, and a little rim so that the form reads without colour.
		float key = 0.5 + 0.5 * dot(n, normalize(vec3(-0.35, 0.75, 0.6)));
		float rim = pow(1.0 - abs(dot(n, eye)), 3.0);
		float light = mix(uShade.x, uShade.y, key) - 0.10 * rim;
		float gloss = pow(max(0.0, dot(reflect(-normalize(vec3(-0.35, 0.75, 0.6)), n), eye)), 28.0);
		colour = colour * light + 0.06 * gloss;

		colour = mix(colour, uLine, 0.5 * contour);
		colour = mix(colour, uInk, 0.85 * edge);
		if (uRing.w > 0.0) {
			float r = distance(vPlace, uRing.xyz) - uRing.w;
			colour = mix(colour, uInk, 0.9 * line(r, fwidth(r), 1.4));
		}
		gl_FragColor = vec4(colour, 1.0);
	}
`;

const ghostFragment = /* glsl */ `
	precision highp float;
	uniform vec3 uInk;
	varying vec3 vNormal;
	varying vec3 vEye;
	void main() {
		float rim = 1.0 - abs(dot(normalize(vNormal), normalize(vEye)));
		float a = 0.05 + 0.60 * smoothstep(0.55, 0.95, rim);
		gl_FragColor = vec4(uInk, a * 0.55);
	}
`;

/** A round step near `x`: 1, 2 or 5 times a power of ten. */
export function roundStep(x: number): number {
	if (!(x > 0)) return 1;
	const power = 10 ** Math.floor(Math.log10(x));
	const m = x / power;
	return power * (m < 1.5 ? 1 : m < 3.5 ? 2 : m < 7.5 ? 5 : 10);
}

/** Between two contour lines for a scale that ends at `limit`. */
export const contourInterval = (limit: number) => roundStep(limit / 5);

/** The shape's surface, coloured by a value at each vertex, and its ghost: where it was before the move. */
export class Surface {
	readonly #geometry = new BufferGeometry();
	readonly #ghostGeometry = new BufferGeometry();
	readonly #material: ShaderMaterial;
	readonly #ghostMaterial: ShaderMaterial;
	readonly mesh: Mesh;
	readonly ghost: Mesh;
	#rest: { position: BufferAttribute; normal: BufferAttribute } | null = null;

	constructor() {
		this.#material = new ShaderMaterial({
			vertexShader,
			fragmentShader,
			side: DoubleSide,
			// The boxes' inner lines must not flicker on the surface.
			polygonOffset: true,
			polygonOffsetFactor: 1,
			polygonOffsetUnits: 1,
			uniforms: {
				uInk: { value: new Color() },
				uLine: { value: new Color() },
				uPlain: { value: new Color() },
				uZero: { value: new Color() },
				uCopper: { value: new Color() },
				uVerdigris: { value: new Color() },
				uShade: { value: [0.6, 1] },
				uLimit: { value: 0 },
				uInterval: { value: 1 },
				uDim: { value: 0 },
				uBoxes: { value: Array.from({ length: MAX_BOXES }, () => new Matrix4()) },
				uBoxCount: { value: 0 },
				uSelected: { value: -1 },
				uRing: { value: new Vector4(0, 0, 0, 0) }
			}
		});
		this.#ghostMaterial = new ShaderMaterial({
			vertexShader,
			fragmentShader: ghostFragment,
			transparent: true,
			depthWrite: false,
			uniforms: { uInk: { value: new Color() } }
		});
		this.mesh = new Mesh(this.#geometry, this.#material);
		this.ghost = new Mesh(this.#ghostGeometry, this.#ghostMaterial);
		// Bounds are the rig's business; three's own would be stale after a move.
		this.mesh.frustumCulled = this.ghost.frustumCulled = false;
		this.mesh.visible = this.ghost.visible = false;
		this.ghost.renderOrder = 1;
	}

	setMesh(mesh: DisplayMesh | null) {
		this.mesh.visible = mesh !== null;
		this.#rest = null;
		this.ghost.visible = false;
		this.#geometry.dispose();
		this.#ghostGeometry.dispose();
		if (!mesh) return;
		const position = new BufferAttribute(mesh.positions, 3);
		const normal = new BufferAttribute(mesh.normals, 3);
		const index = new BufferAttribute(mesh.triangles, 1);
		this.#rest = { position, normal };
		for (const geometry of [this.#geometry, this.#ghostGeometry]) {
			geometry.setIndex(index);
			geometry.setAttribute('position', position);
			geometry.setAttribute('normal', normal);
			geometry.setAttribute('rest', position);
		}
		this.setField(null);
	}

	/** The moved surface in place of the old one; null: the old one again. */
	setMoved(moved: { positions: Float32Array; normals: Float32Array } | null, ghost: boolean) {
		if (!this.#rest) return;
		const { position, normal } = this.#rest;
		this.#geometry.setAttribute('position', moved ? new BufferAttribute(moved.positions, 3) : position);
		this.#geometry.setAttribute('normal', moved ? new BufferAttribute(moved.normals, 3) : normal);
		this.ghost.visible = ghost && moved !== null;
	}

	/** A value at each vertex, and what contour lines follow; null: none. */
	setField(field: { values: Float32Array; levels: Float32Array } | null) {
		if (!this.#rest) return;
		// Without a field the attribute still has to be there: one that costs nothing would need another shader.
		const values = field?.values ?? new Float32Array(this.#rest.position.count);
		this.#geometry.setAttribute('field', new BufferAttribute(values, 1));
		this.#geometry.setAttribute('level', new BufferAttribute(field?.levels ?? values, 1));
	}

	/** Full colour at ±limit; 0: no colour. */
	setLimit(limit: number) {
		this.#material.uniforms.uLimit.value = limit;
		this.#material.uniforms.uInterval.value = contourInterval(limit);
	}

	/** World-to-box matrices (each box is [-1, 1]^3 in its own); `dim`: how far the rest of the surface steps back. */
	setBoxes(inverses: Matrix4[], selected: number, dim: number) {
		const u = this.#material.uniforms;
		const count = Math.min(MAX_BOXES, inverses.length);
		for (let i = 0; i < count; i++) (u.uBoxes.value as Matrix4[])[i].copy(inverses[i]);
		u.uBoxCount.value = count;
		u.uSelected.value = selected < count ? selected : -1;
		u.uDim.value = dim;
	}

	/** A ring on the surface at `radius` metres around a point of it. */
	setRing(centre: Vec3 | null, radius: number) {
		(this.#material.uniforms.uRing.value as Vector4).set(...(centre ?? [0, 0, 0]), centre ? radius : 0);
	}

	setPalette(palette: Palette) {
		const u = this.#material.uniforms;
		(u.uInk.value as Color).copy(palette.ink);
		(u.uLine.value as Color).copy(palette.line);
		(u.uPlain.value as Color).copy(palette.plain);
		(u.uZero.value as Color).copy(palette.zero);
		(u.uCopper.value as Color).copy(palette.copper);
		(u.uVerdigris.value as Color).copy(palette.verdigris);
		u.uShade.value = palette.shade;
		(this.#ghostMaterial.uniforms.uInk.value as Color).copy(palette.ink);
	}

	dispose() {
		this.#geometry.dispose();
		this.#ghostGeometry.dispose();
		this.#material.dispose();
		this.#ghostMaterial.dispose();
	}
}
