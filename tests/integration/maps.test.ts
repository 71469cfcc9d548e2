import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import * as wire from '$lib/api/schemas/common';
import type { Problem } from '$lib/api/schemas/common';
import type { Job } from '$lib/api/schemas/jobs';
import type { Shape } from '$lib/api/schemas/shapes';
import type { Study } from '$lib/api/schemas/studies';
import { call, newScene, ok, problemIn, sendFile, storedRows, type Scene } from '../factories/scene';
import { soupArea, soupOf, weldSoup, writeBinarySoup, type Soup } from '../factories/stl';
import { csvOf, ellipsoid } from '../factories/surfaces';
import { startServer, type TestServer } from '../harness/server';

let server: TestServer;
let scene: Scene;
let shape: Shape;
const mesh = ellipsoid(3, [240, 90, 70]);
/** As the file has it: float32 millimetres. */
const soup: Soup = soupOf(mesh.positions, mesh.triangles);
const METRES = 1e-3;

beforeAll(async () => {
	server = await startServer();
	scene = await newScene(server, 'mm');
	shape = await scene.importShape(writeBinarySoup(soup));
});
afterAll(() => server.stop());

const field = (x: number, y: number, z: number) =>
	Math.cos(3 * x * METRES) * Math.sin(2 * y * METRES + 0.4) + z * METRES;

/** Sum of s_v m_v over the surface, from the file alone: the objective's change for each metre of uniform growth. */
function integral(value: (x: number, y: number, z: number) => number): number {
	const { positions, triangles } = weldSoup(soup);
	let sum = 0;
	for (let t = 0; t < triangles.length; t += 3) {
		const [a, b, c] = [...triangles.subarray(t, t + 3)].map((v) => [...positions.subarray(3 * v, 3 * v + 3)]);
		const u = [0, 1, 2].map((k) => b[k] - a[k]);
		const v = [0, 1, 2].map((k) => c[k] - a[k]);
		const n = [u[1] * v[2] - u[2] * v[1], u[2] * v[0] - u[0] * v[2], u[0] * v[1] - u[1] * v[0]];
		const third = (Math.hypot(...n) / 6) * METRES * METRES;
		for (const [x, y, z] of [a, b, c]) sum += third * value(x, y, z);
	}
	return sum;
}

async function refused(csv: string, query: Record<string, string> = {}): Promise<Problem> {
	const before = await storedRows(server);
	const accepted = await sendFile(server, scene.token, scene.mapPath(shape.id, query), csv);
	let problem: Problem;
	if (accepted.status === 202) {
		const job = await server.job<Job>(accepted.body.jobId, scene.token);
		expect(job.state).toBe('failed');
		problem = wire.problem.parse(job.error);
	} else {
		problem = problemIn(accepted, accepted.status);
	}
	expect(await storedRows(server)).toEqual(before);
	return problem;
}

describe('POST /api/shapes/{id}/sensitivities', () => {
	it('matches a density at vertices and reports it', async () => {
		const report = await scene.importMap(shape.id, csvOf(soup, field));
		const vertices = mesh.positions.length / 3;
		expect(report).toMatchObject({ rows: vertices, matched: vertices, unmatched: 0, coverage: 1 });
		expect(report.maxDistance).toBeLessThan(1e-9);
		expect(report.total / integral(field)).toBeCloseTo(1, 8);
		const [map] = (await scene.shape(shape.id)).maps;
		expect(map).toMatchObject({ id: report.mapId, filename: 'map.csv', kind: 'density', location: 'vertex' });
		expect(map.report).toMatchObject({ matched: vertices, total: report.total });
		const values = new Float32Array(
			await (await server.fetch(`/api/maps/${report.mapId}/values`, { token: scene.token })).arrayBuffer()
		);
		const { positions } = weldSoup(soup);
		const wrong = [...values].filter((value, v) => {
			const expected = field(positions[3 * v], positions[3 * v + 1], positions[3 * v + 2]);
			return !(Math.abs(value - expected) <= 1e-6 * (1 + Math.abs(expected)));
		});
		expect(values).toHaveLength(vertices);
		expect(wrong).toEqual([]);
	});

	it('reads rows in any order, with comments, and turns the sign when outward lowers the objective', async () => {
		const [header, ...rows] = csvOf(soup, field).trimEnd().split('\n');
		const shuffled = ['# a comment', header, ...rows.reverse()].join('\r\n');
		const plain = await scene.importMap(shape.id, shuffled, { filename: 'backwards.csv' });
		const turned = await scene.importMap(shape.id, shuffled, { outward: 'lowers' });
		expect(plain.total / integral(field)).toBeCloseTo(1, 8);
		expect(turned.total).toBeCloseTo(-plain.total, 12);
	});

	it('takes derivatives by node and vectors by node', async () => {
		// A derivative of 1 by node: the total is the number of vertices, whatever their areas.
		const nodal = await scene.importMap(
			shape.id,
			csvOf(soup, () => 1),
			{ kind: 'nodal' }
		);
		expect(nodal.total).toBeCloseTo(mesh.positions.length / 3, 6);

		const { positions } = weldSoup(soup);
		const rows = ['x,y,z,gx,gy,gz'];
		for (let v = 0; v < positions.length; v += 3) rows.push([...positions.subarray(v, v + 3), 2, 0, 0].join());
		const vector = await scene.importMap(shape.id, rows.join('\n'), { kind: 'vector' });
		// Along x everywhere on a body that is symmetric in x: growth outward gains nothing.
		expect(Math.abs(vector.total)).toBeLessThan(1e-6);
	});

	it('takes a density at the faces’ centres', async () => {
		const rows = ['x,y,z,sensitivity'];
		for (let at = 0; at < soup.corners.length; at += 9) {
			const centre = [0, 1, 2].map(
				(c) => (soup.corners[at + c] + soup.corners[at + 3 + c] + soup.corners[at + 6 + c]) / 3
			);
			rows.push([...centre, 3].join());
		}
		const report = await scene.importMap(shape.id, rows.join('\n'), { location: 'face' });
		expect(report.matched).toBe(mesh.triangles.length / 3);
		// Against uniform growth, vertex normals stand askew to their faces by the facets' angle: 3 A within 1 %.
		expect(report.total / (3 * soupArea(soup) * METRES * METRES)).toBeCloseTo(1, 1.5);
	});

	it('says how much of the surface a partial map covers', async () => {
		const lines = csvOf(soup, field).trimEnd().split('\n');
		const beyond = (x: number) => [lines[0], ...lines.slice(1).filter((line) => Number(line.split(',')[0]) > x)];
		const most = beyond(-100);
		const report = await scene.importMap(shape.id, most.join('\n'));
		expect(report.rows).toBe(most.length - 1);
		expect(report.coverage).toBeGreaterThan(0.6);
		expect(report.coverage).toBeLessThan(0.8);
		// Less than half of the surface says that the map belongs to another shape, or is in another unit.
		const problem = await refused(beyond(0).join('\n'));
		expect(problem.code).toBe('bad-file');
		expect(problem.detail).toMatch(/4\d %/);
	});

	it('matches points beside the vertices by the nearest place, and counts those that are far off', async () => {
		const { positions } = weldSoup(soup);
		const rows = ['x,y,z,sensitivity'];
		// 0.05 mm outward along each radius.
		for (let v = 0; v < positions.length; v += 3) {
			const p = [...positions.subarray(v, v + 3)];
			rows.push([...p.map((x) => x * (1 + 0.05 / Math.hypot(...p))), 1].join());
		}
		rows.push('5000,0,0,1');
		const report = await scene.importMap(shape.id, rows.join('\n'));
		expect(report).toMatchObject({ rows: rows.length - 1, matched: rows.length - 2, unmatched: 1 });
		expect(report.maxDistance).toBeGreaterThan(1e-6);
		expect(report.maxDistance).toBeLessThan(0.06 * METRES);
	});
});

describe('a map that can’t be used', () => {
	it('is refused with file and line', async () => {
		const lines = csvOf(soup, field).split('\n');
		lines[10] = lines[10].replace(/,[^,]*$/, ',n/a');
		const problem = await refused(lines.join('\n'), { filename: 'adjoint.csv' });
		expect(problem.code).toBe('bad-file');
		expect(problem.detail).toContain('adjoint.csv');
		expect(problem.detail).toMatch(/line 11/i);
		expect(problem.mend).toMatch(/./);
		lines[10] = '1,2';
		expect((await refused(lines.join('\n'))).detail).toMatch(/line 11/i);
		lines[10] = '1,2,3,inf';
		expect((await refused(lines.join('\n'))).detail).toMatch(/line 11/i);
	});

	it('is refused when empty, when it lies elsewhere, and when its kind is another', async () => {
		expect((await refused('')).detail).toMatch(/empty/i);
		expect((await refused('x,y,z,sensitivity\n')).code).toBe('bad-file');
		// The usual slip: a map in metres on a surface in millimetres.
		const metres = await refused(
			'x,y,z,sensitivity\n' + Array.from({ length: 50 }, (_, n) => `9${n},7,5,1`).join('\n')
		);
		expect(metres.code).toBe('bad-file');
		expect(metres.mend).toMatch(/unit/i);
		expect((await refused(csvOf(soup, field), { kind: 'vector' })).code).toBe('bad-file');
	});

	it('is refused for another study’s objective, and for a query that can’t be', async () => {
		const other = await newScene(server);
		const foreign = await refused(csvOf(soup, field), { objectiveId: other.objective.id });
		expect(foreign.errors?.map(({ pointer }) => pointer)).toEqual(['/objectiveId']);
		const wrong = await refused(csvOf(soup, field), { kind: 'scalar', location: 'edge' });
		expect(wrong.errors?.map(({ pointer }) => pointer).sort()).toEqual(['/kind', '/location']);
		const viewer = await scene.member('viewer');
		problemIn(await sendFile(server, viewer.token, scene.mapPath(shape.id), 'x'), 403, 'forbidden');
		problemIn(await sendFile(server, other.token, scene.mapPath(shape.id), 'x'), 404, 'not-found');
	});
});

describe('POST /api/shapes/{id}/results', () => {
	const path = () => `/api/shapes/${shape.id}/results`;

	it('keeps a correction beside what it corrects and shows the latest', async () => {
		await scene.addResult(shape.id, 44.8, 0.35);
		await scene.addResult(shape.id, 44.1, 0.3);
		const { results, state } = await scene.shape(shape.id);
		expect(results.map(({ value, uncertainty }) => [value, uncertainty])).toEqual([[44.1, 0.3]]);
		expect(state).toBe('baseline');
		expect(await server.query('SELECT 1 FROM results WHERE shape_id = $1', [shape.id])).toHaveLength(2);
	});

	it('refuses what is no result', async () => {
		const wrong = await call(server, scene.token, 'POST', path(), {
			objectiveId: scene.objective.id,
			value: '44',
			uncertainty: -1
		});
		const problem = problemIn(wrong, 422, 'invalid');
		expect(problem.errors?.map(({ pointer }) => pointer).sort()).toEqual(['/uncertainty', '/value']);
		const other = await newScene(server);
		const foreign = await call(server, scene.token, 'POST', path(), { objectiveId: other.objective.id, value: 1 });
		expect(problemIn(foreign, 422).errors?.map(({ pointer }) => pointer)).toEqual(['/objectiveId']);
		const { operatingPoints } = await ok<Study>(server, other.token, 'GET', `/api/studies/${other.study.id}`);
		const point = await call(server, scene.token, 'POST', path(), {
			objectiveId: scene.objective.id,
			operatingPointId: operatingPoints[0].id,
			value: 1
		});
		expect(problemIn(point, 422).errors?.map(({ pointer }) => pointer)).toEqual(['/operatingPointId']);
	});
});
