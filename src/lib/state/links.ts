import { apiPath } from '$lib/api/client';

/** Addresses of screens and files, in one place. */
export const ledgerHref = (studyId: string) => `/studies/${studyId}`;
export const benchHref = (studyId: string, shapeId: string) => `/studies/${studyId}/bench?shape=${shapeId}`;
export const studyHref = (studyId: string) => `/studies/${studyId}/study`;
export const stlHref = (shapeId: string, encoding?: 'binary' | 'ascii') =>
	apiPath('getStl', { id: shapeId }, { encoding });
export const handoverHref = (shapeId: string) => apiPath('getHandover', { id: shapeId });
export const originalHref = (shapeId: string) => apiPath('getOriginal', { id: shapeId });
