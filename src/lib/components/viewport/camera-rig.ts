import { Box3, OrthographicCamera, PerspectiveCamera, Vector3 } from 'three';
import { OrbitControls } from 'three/examples/jsm/controls/OrbitControls.js';
import type { Vec3 } from '$lib/workers/display-protocol';

export type Projection = 'perspective' | 'orthographic';
/** Where the eye stands, seen from the middle of the shape. */
export type ViewName = '+x' | '-x' | '+y' | '-y' | '+z' | '-z' | 'corner';

const FOV_DEGREES = 28;
const directions: Record<ViewName, Vec3> = {
	'+x': [1, 0, 0],
	'-x': [-1, 0, 0],
	'+y': [0, 1, 0],
	'-y': [0, -1, 0],
	// Exactly along z the view's turn about z would be undefined; this is off by less than a pixel.
	'+z': [0, -1e-5, 1],
	'-z': [0, -1e-5, -1],
	corner: [0.62, -0.72, 0.36]
};
const TURN_MS = 260;

/** One eye with two projections: orbit, pan, zoom to the cursor (mouse, touch, keys), set views, flights. z is up. */
export class CameraRig {
	readonly #perspective = new PerspectiveCamera(FOV_DEGREES, 1, 0.001, 1000);
	readonly #orthographic = new OrthographicCamera(-1, 1, 1, -1, 0.001, 1000);
	readonly #controls: OrbitControls;
	readonly #changed: () => void;
	readonly #bounds = new Box3(new Vector3(-1, -1, -1), new Vector3(1, 1, 1));
	#aspect = 1;
	#height = 1;
	/** Share of the picture's width and height that other things cover, from the left, right, top and bottom. */
	#inset = { left: 0, right: 0, top: 0, bottom: 0 };
	#flight = 0;

	constructor(element: HTMLElement, changed: () => void) {
		this.#changed = changed;
		this.#perspective.up.set(0, 0, 1);
		this.#orthographic.up.set(0, 0, 1);
		this.#perspective.position.set(0, -6, 2);
		this.#controls = new OrbitControls(this.#perspective, element);
		this.#controls.zoomToCursor = true;
		this.#controls.zoomSpeed = 1.2;
		this.#controls.rotateSpeed = 0.9;
		this.#controls.addEventListener('change', () => {
			this.#clip();
			changed();
		});
		this.#controls.addEventListener('start', () => this.#land());
	}

	get camera(): PerspectiveCamera | OrthographicCamera {
		return this.#controls.object as PerspectiveCamera | OrthographicCamera;
	}

	get projection(): Projection {
		return this.camera === this.#perspective ? 'perspective' : 'orthographic';
	}

	/** Whether dragging on the canvas turns the view. */
	set enabled(on: boolean) {
		this.#controls.enabled = on;
	}

	/** Scene metres across one picture pixel, at the point that the eye turns about. */
	get metresPerPixel(): number {
		return this.#span() / this.#height;
	}

	setBounds(min: Vec3, max: Vec3) {
		this.#bounds.min.set(...min);
		this.#bounds.max.set(...max);
		this.#clip();
	}

	resize(width: number, height: number, inset: { left: number; right: number; top: number; bottom: number }) {
		this.#aspect = width / height;
		this.#height = height;
		this.#inset = {
			left: inset.left / width,
			right: inset.right / width,
			top: inset.top / height,
			bottom: inset.bottom / height
		};
		this.#frame(this.#span());
	}

	setProjection(projection: Projection) {
		if (projection === this.projection) return;
		const from = this.camera;
		const span = this.#span();
		const to = projection === 'perspective' ? this.#perspective : this.#orthographic;
		to.position.copy(from.position);
		this.#controls.object = to;
		this.#orthographic.zoom = 1;
		if (projection === 'perspective') {
			const distance = span / 2 / Math.tan((FOV_DEGREES * Math.PI) / 360);
			const back = from.position.clone().sub(this.#controls.target).setLength(distance);
			to.position.copy(this.#controls.target).add(back);
		}
		this.#frame(span);
		this.#controls.update();
		this.#changed();
	}

	/** Turns to a set view; the distance stays, unless `fit`. */
	view(name: ViewName, fit = true) {
		const back = new Vector3(...directions[name]).normalize();
		const { target, span } = fit ? this.#fitting(back) : { target: this.#controls.target.clone(), span: this.#span() };
		this.#fly(target, back, span);
	}

	fit() {
		const back = this.camera.position.clone().sub(this.#controls.target).normalize();
		const { target, span } = this.#fitting(back);
		this.#fly(target, back, span);
	}

	/** Looks straight at a point, from outside along `normal`, `span` metres high. */
	lookAt(point: Vec3, normal: Vec3 | null, span: number) {
		const now = this.camera.position.clone().sub(this.#controls.target).normalize();
		const back = normal ? new Vector3(...normal).lerp(now, 0.35).normalize() : now;
		this.#fly(new Vector3(...point), back, span);
	}

	/** Turns by angles in radians: as dragging does. */
	turn(left: number, up: number) {
		this.#land();
		this.#controls.rotateLeft(left);
		this.#controls.rotateUp(up);
		this.#controls.update();
	}

	/** Shifts the picture by pixels. */
	pan(right: number, down: number) {
		this.#land();
		this.#controls.pan(right, down);
		this.#controls.update();
	}

	/** Nearer for a factor above 1. */
	zoom(factor: number) {
		this.#land();
		this.#controls.dollyIn(1 / factor);
		this.#controls.update();
	}

	/** At once, without a flight: for the first picture. */
	place(name: ViewName) {
		const back = new Vector3(...directions[name]).normalize();
		const { target, span } = this.#fitting(back);
		this.#set(target, back, span);
	}

	dispose() {
		this.#land();
		this.#controls.dispose();
	}

	/** Height of what the picture shows at the target, metres. */
	#span(): number {
		const camera = this.camera;
		if (camera instanceof OrthographicCamera) return (camera.top - camera.bottom) / camera.zoom;
		return 2 * camera.position.distanceTo(this.#controls.target) * Math.tan((FOV_DEGREES * Math.PI) / 360);
	}

	/** Target and height with which the bounds fill the free part of the picture, seen from `back`. */
	#fitting(back: Vector3): { target: Vector3; span: number } {
		const forward = back.clone().negate();
		const right = new Vector3().crossVectors(forward, new Vector3(0, 0, 1)).normalize();
		const up = new Vector3().crossVectors(right, forward);
		const centre = this.#bounds.getCenter(new Vector3());
		const half = this.#bounds.getSize(new Vector3()).multiplyScalar(0.5);
		const reach = (d: Vector3) => Math.abs(d.x) * half.x + Math.abs(d.y) * half.y + Math.abs(d.z) * half.z;
		const { left, right: r, top, bottom } = this.#inset;
		const wide = Math.max(0.2, 1 - left - r);
		const high = Math.max(0.2, 1 - top - bottom);
		const depth = this.projection === 'perspective' ? reach(forward) * 2 * Math.tan((FOV_DEGREES * Math.PI) / 360) : 0;
		const span = Math.max((2 * reach(up)) / high, (2 * reach(right)) / wide / this.#aspect) * 1.12 + depth;
		// The free part's middle is not the picture's: shift the target so that the shape stands in it.
		const target = centre
			.addScaledVector(right, ((r - left) / 2) * span * this.#aspect)
			.addScaledVector(up, ((top - bottom) / 2) * span);
		return { target, span };
	}

	#fly(target: Vector3, back: Vector3, span: number) {
		this.#land();
		if (matchMedia('(prefers-reduced-motion: reduce)').matches) return this.#set(target, back, span);
		const from = {
			target: this.#controls.target.clone(),
			back: this.camera.position.clone().sub(this.#controls.target).normalize(),
			span: this.#span()
		};
		const begun = performance.now();
		const tick = (now: number) => {
			const t = Math.min(1, (now - begun) / TURN_MS);
			const s = t * t * (3 - 2 * t);
			const between = from.back.clone().lerp(back, s);
			if (between.lengthSq() < 1e-4) between.copy(back);
			this.#set(from.target.clone().lerp(target, s), between.normalize(), from.span * (span / from.span) ** s);
			this.#flight = t < 1 ? requestAnimationFrame(tick) : 0;
		};
		this.#flight = requestAnimationFrame(tick);
	}

	#land() {
		cancelAnimationFrame(this.#flight);
		this.#flight = 0;
	}

	#set(target: Vector3, back: Vector3, span: number) {
		const distance = span / 2 / Math.tan((FOV_DEGREES * Math.PI) / 360);
		this.#controls.target.copy(target);
		this.camera.position.copy(target).addScaledVector(back, distance);
		this.#orthographic.zoom = 1;
		this.#frame(span);
		this.#controls.update();
		this.#changed();
	}

	#frame(span: number) {
		this.#perspective.aspect = this.#aspect;
		this.#perspective.updateProjectionMatrix();
		const zoom = this.#orthographic.zoom;
		const half = (span * zoom) / 2;
		this.#orthographic.top = half;
		this.#orthographic.bottom = -half;
		this.#orthographic.right = half * this.#aspect;
		this.#orthographic.left = -half * this.#aspect;
		this.#orthographic.updateProjectionMatrix();
		this.#clip();
	}

	/** Near and far planes around the shape, so that depth is fine at every size. */
	#clip() {
		const centre = this.#bounds.getCenter(new Vector3());
		const radius = Math.max(1e-6, this.#bounds.getSize(new Vector3()).length());
		const distance = this.camera.position.distanceTo(centre);
		for (const camera of [this.#perspective, this.#orthographic]) {
			camera.near =
				camera === this.#orthographic ? distance - 4 * radius : Math.max(radius * 1e-3, distance - 4 * radius);
			camera.far = distance + 4 * radius;
			camera.updateProjectionMatrix();
		}
	}
}
