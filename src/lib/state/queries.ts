/**
 * The queries that several screens share: one key and one fetcher each, so that a change made on one screen is seen on the
 * other. Hand them to `createQuery(() => ({...studyQuery(id), initialData: data.study}))`.
 */
import { queryOptions, type QueryClient } from '@tanstack/svelte-query';
import { api } from '$lib/api/client';

export const keys = {
	studies: ['studies'] as const,
	study: (id: string) => ['study', id] as const,
	shapes: (studyId: string) => ['study', studyId, 'shapes'] as const,
	members: (studyId: string) => ['study', studyId, 'members'] as const,
	shape: (id: string) => ['shape', id] as const,
	tokens: ['tokens'] as const,
	users: ['users'] as const
};

export const studyQuery = (id: string) =>
	queryOptions({ queryKey: keys.study(id), queryFn: ({ signal }) => api.getStudy({ id, signal }) });

export const shapesQuery = (studyId: string) =>
	queryOptions({ queryKey: keys.shapes(studyId), queryFn: ({ signal }) => api.listShapes({ id: studyId, signal }) });

export const membersQuery = (studyId: string) =>
	queryOptions({ queryKey: keys.members(studyId), queryFn: ({ signal }) => api.listMembers({ id: studyId, signal }) });

export const shapeQuery = (id: string) =>
	queryOptions({ queryKey: keys.shape(id), queryFn: ({ signal }) => api.getShape({ id, signal }) });

export const tokensQuery = () =>
	queryOptions({ queryKey: keys.tokens, queryFn: ({ signal }) => api.listTokens({ signal }) });

export const usersQuery = () =>
	queryOptions({ queryKey: keys.users, queryFn: ({ signal }) => api.listUsers({ signal }) });

/** After anything that changes a study's shapes, results or maps. */
export async function studyChanged(client: QueryClient, studyId: string, shapeId?: string) {
	await Promise.all([
		client.invalidateQueries({ queryKey: keys.study(studyId) }),
		client.invalidateQueries({ queryKey: keys.studies }),
		shapeId ? client.invalidateQueries({ queryKey: keys.shape(shapeId) }) : undefined
	]);
}
