import { Scene, Vector3, WebGLRenderer, type Material, type Mesh } from 'three';
import { boxInverse, type Ray } from '$lib/state/bench-geometry';
import type { DisplayMesh, Vec3 } from '$lib/workers/display-protocol';
import { Cage, type BoxDrawing } from './cage';
import { CameraRig } from './camera-rig';
import { Keeping, lockedMesh, type KeepingDrawing } from './keeping';
import { readPalette, type Palette } from './palette';
import { Surface } from './surface';

export interface Inset {
	left: number;
	right: number;
	top: number;
	bottom: number;
}

/**
 * The picture: one surface, its ghost, its boxes. Knows nothing of the page around it; draws when something has changed and
 * not otherwise. Arrays handed in are borrowed until the next call that replaces them.
 */
export class Viewport {
	readonly rig: CameraRig;
	readonly #renderer: WebGLRenderer;
	readonly #scene = new Scene();
	readonly #surface = new Surface();
	readonly #host: HTMLElement;
	readonly #drawn: () => void;
	readonly #keeping = new Keeping();
	#keepingDrawing: KeepingDrawing | null = null;
	#painted: Mesh | null = null;
	#paint: Uint32Array | null = null;
	#mesh: DisplayMesh | null = null;
	#cages: Cage[] = [];
	#boxes: BoxDrawing[] = [];
	#dim = 0;
	#palette: Palette;
	#pending = 0;
	#size = { width: 1, height: 1 };

	/** `host` takes the canvas and the pointer's gestures; `drawn` is called after each picture. Throws without WebGL2. */
	constructor(host: HTMLElement, drawn: () => void) {
		this.#host = host;
		this.#drawn = drawn;
		this.#renderer = new WebGLRenderer({ antialias: true, alpha: true, powerPreference: 'high-performance' });
		this.#renderer.setClearAlpha(0);
		const canvas = this.#renderer.domElement;
		canvas.style.display = 'block';
		canvas.setAttribute('aria-hidden', 'true');
		host.prepend(canvas);
		this.rig = new CameraRig(host, () => this.invalidate());
		this.#palette = readPalette(host);
		this.#surface.setPalette(this.#palette);
		this.#scene.add(this.#surface.mesh, this.#surface.ghost, this.#keeping.group);
		canvas.addEventListener('webglcontextrestored', () => this.invalidate());
	}

	get palette(): Palette {
		return this.#palette;
	}

	resize(width: number, height: number, inset: Inset) {
		if (width < 1 || height < 1) return;
		this.#size = { width, height };
		this.#renderer.setPixelRatio(Math.min(2, devicePixelRatio));
		this.#renderer.setSize(width, height);
		this.rig.resize(width, height, inset);
		// Setting the size clears the picture: draw at once, or the page would blink.
		this.#render();
	}

	/** After the theme has changed. */
	retint() {
		this.#palette = readPalette(this.#host);
		this.#surface.setPalette(this.#palette);
		this.setBoxes(this.#boxes, this.#dim);
		this.setKeeping(this.#keepingDrawing);
		this.setPaint(this.#paint);
	}

	setMesh(mesh: DisplayMesh | null) {
		this.#surface.setMesh(mesh);
		this.#mesh = mesh;
		this.setKeeping(this.#keepingDrawing);
		if (mesh) this.rig.setBounds(mesh.bounds.min, mesh.bounds.max);
		this.invalidate();
	}

	setMoved(moved: { positions: Float32Array; normals: Float32Array } | null, ghost: boolean) {
		this.#surface.setMoved(moved, ghost);
		this.invalidate();
	}

	setField(field: { values: Float32Array; levels: Float32Array } | null) {
		this.#surface.setField(field);
		this.invalidate();
	}

	setLimit(limit: number) {
		this.#surface.setLimit(limit);
		this.invalidate();
	}

	/** `dim` 0..1: how far the surface outside the selected box steps back. */
	setBoxes(boxes: BoxDrawing[], dim: number) {
		this.#boxes = boxes;
		this.#dim = dim;
		while (this.#cages.length < boxes.length) {
			const cage = new Cage();
			this.#cages.push(cage);
			this.#scene.add(cage.group);
		}
		for (const cage of this.#cages.splice(boxes.length)) {
			this.#scene.remove(cage.group);
			cage.dispose();
		}
		const ratio = this.#renderer.getPixelRatio();
		boxes.forEach((drawing, i) => this.#cages[i].draw(drawing, this.#palette, ratio));
		this.#surface.setBoxes(
			boxes.map((b) => boxInverse(b.box)),
			boxes.findIndex((b) => b.selected),
			dim
		);
		this.invalidate();
	}

	/** Keep-outs, symmetry plane, locked triangles; null: none. */
	setKeeping(drawing: KeepingDrawing | null) {
		this.#keepingDrawing = drawing;
		if (drawing) this.#keeping.draw(drawing, this.#mesh, this.#palette);
		else this.#keeping.clear();
		this.invalidate();
	}

	/** Triangles painted just now, ascending ids; null: nobody paints. */
	setPaint(triangles: Uint32Array | null) {
		this.#paint = triangles;
		if (this.#painted) {
			this.#scene.remove(this.#painted);
			this.#painted.geometry.dispose();
			(this.#painted.material as Material).dispose();
			this.#painted = null;
		}
		if (triangles && triangles.length > 0 && this.#mesh) {
			this.#painted = lockedMesh(triangles, this.#mesh, this.#palette);
			this.#scene.add(this.#painted);
		}
		this.invalidate();
	}

	setRing(centre: Vec3 | null, radius: number) {
		this.#surface.setRing(centre, radius);
		this.invalidate();
	}

	/** Where a point stands in the picture: pixels from its top left; null behind the eye. */
	project(point: Vec3): { x: number; y: number } | null {
		const p = new Vector3(...point).project(this.rig.camera);
		if (p.z > 1 || p.z < -1) return null;
		return { x: ((p.x + 1) / 2) * this.#size.width, y: ((1 - p.y) / 2) * this.#size.height };
	}

	/** The line of sight through a place in the picture. */
	ray(x: number, y: number): Ray {
		const ndc = { x: (2 * x) / this.#size.width - 1, y: 1 - (2 * y) / this.#size.height };
		const near = new Vector3(ndc.x, ndc.y, -1).unproject(this.rig.camera);
		const far = new Vector3(ndc.x, ndc.y, 1).unproject(this.rig.camera);
		const direction = far.sub(near).normalize();
		return { origin: [near.x, near.y, near.z], direction: [direction.x, direction.y, direction.z] };
	}

	/** The picture's own axes in the study's frame, unit: to the right, up, towards the eye; and the eye's place. */
	frame(): { right: Vec3; up: Vec3; back: Vec3; eye: Vec3 } {
		const e = this.rig.camera.matrixWorld.elements;
		const p = this.rig.camera.position;
		return { right: [e[0], e[1], e[2]], up: [e[4], e[5], e[6]], back: [e[8], e[9], e[10]], eye: [p.x, p.y, p.z] };
	}

	invalidate() {
		this.#pending ||= requestAnimationFrame(() => this.#render());
	}

	dispose() {
		cancelAnimationFrame(this.#pending);
		this.rig.dispose();
		this.#surface.dispose();
		this.#keeping.clear();
		this.setPaint(null);
		for (const cage of this.#cages) cage.dispose();
		this.#renderer.dispose();
		this.#renderer.domElement.remove();
	}

	#render() {
		cancelAnimationFrame(this.#pending);
		this.#pending = 0;
		this.#renderer.render(this.#scene, this.rig.camera);
		this.#drawn();
	}
}
