import { expect, test } from 'vitest';
import { sameBaseline } from '$lib/state/bench-lineage';

test('distances are measured between shapes of one baseline only, however far apart', () => {
	const shapes = [
		{ id: 'a', parentId: null },
		{ id: 'b', parentId: 'a' },
		{ id: 'other', parentId: null },
		{ id: 'c', parentId: 'b' },
		{ id: 'd', parentId: 'a' }
	];
	expect(sameBaseline(shapes, 'c').map((s) => s.id)).toEqual(['a', 'b', 'd']);
	expect(sameBaseline(shapes, 'other')).toEqual([]);
	expect(sameBaseline(shapes, null)).toEqual([]);
	expect(sameBaseline(shapes, 'unknown')).toEqual([]);
});
