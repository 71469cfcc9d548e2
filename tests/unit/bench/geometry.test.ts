import fc from 'fast-check';
import { Quaternion, Vector3 } from 'three';
import { describe, expect, test } from 'vitest';
import {
	alongLine,
	angleAbout,
	boxAxis,
	boxInverse,
	boxPoint,
	faceMoved,
	faceNames,
	fromAngles,
	onPlane,
	toAngles,
	turned,
	type AxisIndex,
	type Placement
} from '$lib/state/bench-geometry';
import { beginDrag } from '$lib/components/viewport/drag';

type Vec3 = [number, number, number];

const coordinate = fc.double({ min: -2, max: 2, noNaN: true });
const angle = fc.double({ min: -180, max: 180, noNaN: true });
const length = fc.double({ min: 0.05, max: 1.5, noNaN: true });
const vec3 = fc.tuple(coordinate, coordinate, coordinate);
const placement = fc
	.record({ centre: vec3, halfSize: fc.tuple(length, length, length), angles: fc.tuple(angle, angle, angle) })
	.map(({ centre, halfSize, angles }): Placement => ({ centre, halfSize, rotation: fromAngles(angles) }));

const expectNear = (a: readonly number[], b: readonly number[], digits = 9) =>
	a.forEach((x, k) => expect(x).toBeCloseTo(b[k], digits));

describe('a design box’s placement', () => {
	test('its point and its inverse undo each other', () => {
		fc.assert(
			fc.property(placement, vec3, (box, at) => {
				const back = new Vector3(...boxPoint(box, at)).applyMatrix4(boxInverse(box));
				expectNear([back.x, back.y, back.z], at, 8);
			})
		);
	});

	test('typed angles turn about the frame’s fixed x, then y, then z', () => {
		fc.assert(
			fc.property(angle, angle, angle, vec3, (x, y, z, point) => {
				const v = new Vector3(...point);
				(
					[
						[1, 0, 0],
						[0, 1, 0],
						[0, 0, 1]
					] as Vec3[]
				).forEach((axis, k) =>
					v.applyQuaternion(new Quaternion().setFromAxisAngle(new Vector3(...axis), ([x, y, z][k] * Math.PI) / 180))
				);
				const [qx, qy, qz, qw] = fromAngles([x, y, z]);
				const w = new Vector3(...point).applyQuaternion(new Quaternion(qx, qy, qz, qw));
				expectNear(w.toArray(), v.toArray());
			})
		);
	});

	test('angles read back give the same turn', () => {
		fc.assert(
			fc.property(placement, (box) => {
				const again = { ...box, rotation: fromAngles(toAngles(box.rotation)) };
				for (const k of [0, 1, 2] as AxisIndex[]) expectNear(boxAxis(again, k), boxAxis(box, k), 6);
			})
		);
	});

	test('a face moves by what is asked and the one opposite stays', () => {
		fc.assert(
			fc.property(
				placement,
				fc.constantFrom(...faceNames),
				fc.double({ min: -0.04, max: 1, noNaN: true }),
				(box, face, by) => {
					const k = 'uvw'.indexOf(face[0]) as AxisIndex;
					const side = face[1] === '1' ? 1 : -1;
					const at = (s: number): Vec3 => [0, 1, 2].map((i) => (i === k ? s : 0)) as Vec3;
					const moved = faceMoved(box, face, by, 1e-3);
					expectNear(boxPoint(moved, at(-side)), boxPoint(box, at(-side)), 9);
					const axis = boxAxis(box, k);
					const wanted = boxPoint(box, at(side)).map((x, i) => x + side * by * axis[i]);
					expectNear(boxPoint(moved, at(side)), wanted, 9);
				}
			)
		);
	});

	test('a side never gets shorter than the least', () => {
		const box: Placement = { centre: [0, 0, 0], halfSize: [1, 1, 1], rotation: [0, 0, 0, 1] };
		const moved = faceMoved(box, 'u1', -5, 0.1);
		expect(moved.halfSize[0]).toBeCloseTo(0.05, 12);
		expect(moved.centre[0] - moved.halfSize[0]).toBeCloseTo(-1, 12);
	});
});

describe('dragging', () => {
	const box: Placement = { centre: [0.1, -0.2, 0.3], halfSize: [0.5, 0.4, 0.3], rotation: fromAngles([10, -20, 35]) };
	const context = {
		right: [1, 0, 0] as Vec3,
		up: [0, 0, 1] as Vec3,
		back: [0, -1, 0] as Vec3,
		metresPerPixel: 0.002,
		metresPerUnit: 0.001
	};
	const eye: Vec3 = [0.5, -5, 1];
	const towards = (p: Vec3) => {
		const d = new Vector3(...p).sub(new Vector3(...eye)).normalize();
		return { origin: eye, direction: d.toArray() as Vec3 };
	};
	const none = { shift: false, alt: true };

	test('a face follows the pointer along its axis', () => {
		const from = boxPoint(box, [1, 0, 0]);
		const axis = boxAxis(box, 0);
		const to = from.map((x, i) => x + 0.123 * axis[i]) as Vec3;
		const moved = beginDrag(box, { kind: 'face', face: 'u1' }, from, towards(from), context)(towards(to), none);
		expectNear(boxPoint(moved, [1, 0, 0]), to, 9);
		expectNear(boxPoint(moved, [-1, 0, 0]), boxPoint(box, [-1, 0, 0]), 9);
	});

	test('a length keeps to round steps of the study’s unit', () => {
		const from = boxPoint(box, [0, 0, 1]);
		const axis = boxAxis(box, 2);
		const to = from.map((x, i) => x + 0.01234 * axis[i]) as Vec3;
		const drag = beginDrag(box, { kind: 'face', face: 'w1' }, from, towards(from), context);
		expect(2 * drag(towards(to), { shift: false, alt: false }).halfSize[2]).toBeCloseTo(0.612, 9);
	});

	test('a ring turns about the box’s own axis by the angle seen', () => {
		const place = boxPoint(box, [1, 1, 0]);
		const wanted = turned(box, 2, 0.3);
		const to = boxPoint({ ...wanted }, [1, 1, 0]);
		const drag = beginDrag(box, { kind: 'turn', axis: 2 }, place, towards(place), {
			...context,
			back: boxAxis(box, 2)
		});
		const made = drag(towards(to), none);
		for (const k of [0, 1, 2] as AxisIndex[]) expectNear(boxAxis(made, k), boxAxis(wanted, k), 6);
	});

	test('the nearest place on a line, the place on a plane and the angle agree with direct geometry', () => {
		const ray = towards([0.4, 0.7, -0.2]);
		const axis = new Vector3(1, 2, -1).normalize().toArray() as Vec3;
		const t = alongLine(ray, [0, 1, 0], axis);
		const at = (s: number) => new Vector3(0, 1, 0).addScaledVector(new Vector3(...axis), s);
		const apart = (s: number) =>
			at(s)
				.sub(new Vector3(...ray.origin))
				.cross(new Vector3(...ray.direction))
				.length();
		expect(apart(t)).toBeLessThan(apart(t + 1e-4));
		expect(apart(t)).toBeLessThan(apart(t - 1e-4));
		const hit = onPlane(ray, [0, 0, -0.2], [0, 0, 1])!;
		expectNear(hit, [0.4, 0.7, -0.2], 9);
		expect(angleAbout([0, 0, 0], [0, 0, 1], [2, 0, 5], [0, 3, -1])).toBeCloseTo(Math.PI / 2, 12);
	});
});
