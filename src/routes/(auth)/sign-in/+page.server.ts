import { fail, redirect } from '@sveltejs/kit';
import { signIn } from '../../../auth';
import type { Actions, PageServerLoad } from './$types';

/** Where to go afterwards: a path of this site and nothing else (`/.//other.site` would resolve to `//other.site`). */
const target = (url: URL) => {
	const to = url.searchParams.get('to') ?? '/';
	const resolved = URL.canParse(to, url) ? new URL(to, url) : null;
	if (!resolved || resolved.origin !== url.origin || resolved.pathname.startsWith('//')) return '/';
	return resolved.pathname + resolved.search;
};

export const load: PageServerLoad = ({ locals, url }) => {
	if (locals.user) redirect(303, target(url));
};

export const actions: Actions = {
	default: async (event) => {
		const form = await event.request.formData();
		const email = String(form.get('email') ?? '').trim();
		const password = String(form.get('password') ?? '');
		if (!email || !password) return fail(400, { email, message: 'Enter your e-mail and your password.' });
		const refusal = await signIn(event, email, password);
		if (refusal) return fail(refusal.code === 'too-many-requests' ? 429 : 400, { email, message: refusal.message });
		redirect(303, target(event.url));
	}
};
