import { apiPath } from '$lib/api/client';
import type { ShapeSummary } from '$lib/api/schemas/shapes';

/** Addresses of screens and files, in one place. */
export const ledgerHref = (studyId: string) => `/studies/${studyId}`;
export const benchHref = (shape: Pick<ShapeSummary, 'studyId' | 'number'>) =>
	`/studies/${shape.studyId}/bench/${shape.number}`;
export const studyHref = (studyId: string) => `/studies/${studyId}/study`;
export const stlHref = (shapeId: string, encoding?: 'binary' | 'ascii') =>
	apiPath('getStl', { id: shapeId }, { encoding });
export const handoverHref = (shapeId: string) => apiPath('getHandover', { id: shapeId });
export const originalHref = (shapeId: string) => apiPath('getOriginal', { id: shapeId });
/** The shape in the other formats, for a download menu. */
export const meshItems = (shapeId: string) =>
	(
		[
			['OBJ', 'getObj'],
			['PLY', 'getPly'],
			['VTP', 'getVtp']
		] as const
	).map(([label, name]) => ({
		label,
		href: apiPath(name, { id: shapeId }),
		download: true
	}));
