import { redirect } from '@sveltejs/kit';
import type { LayoutServerLoad } from './$types';

export const load: LayoutServerLoad = ({ locals, url }) => {
	if (!locals.user) redirect(303, `/sign-in?to=${encodeURIComponent(url.pathname + url.search)}`);
	const { id, email, name, isAdmin } = locals.user;
	return { user: { id, email, name, isAdmin } };
};
