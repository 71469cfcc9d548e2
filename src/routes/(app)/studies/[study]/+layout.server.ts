import { loadFrom } from '$lib/api/server';
import type { LayoutServerLoad } from './$types';

export const load: LayoutServerLoad = async ({ fetch, params, depends }) => {
	depends('planish:study');
	const id = params.study;
	const [study, members] = await loadFrom(fetch, (api) => Promise.all([api.getStudy({ id }), api.listMembers({ id })]));
	return { study, members };
};
