import type { ShapeSummary } from '$lib/api/schemas/shapes';

/** The other shapes that descend from the same baseline as shape `id`; they share its triangles, vertex by vertex. */
export function sameBaseline<S extends Pick<ShapeSummary, 'id' | 'parentId'>>(shapes: S[], id: string | null): S[] {
	const byId = new Map(shapes.map((s) => [s.id, s]));
	const rootOf = (start: string): string => {
		let at = start;
		for (let parent = byId.get(at)?.parentId; parent; parent = byId.get(at)?.parentId) at = parent;
		return at;
	};
	if (id === null || !byId.has(id)) return [];
	const root = rootOf(id);
	return shapes.filter((s) => s.id !== id && rootOf(s.id) === root);
}
