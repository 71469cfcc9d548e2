import { error } from '@sveltejs/kit';
import { answerForm, loadFrom } from '$lib/api/server';
import type { Actions, PageServerLoad } from './$types';

export const load: PageServerLoad = async ({ fetch, locals }) => {
	if (!locals.user?.isAdmin) error(403, 'This page is for administrators.');
	const [users, tokens, studies] = await loadFrom(fetch, (api) =>
		Promise.all([api.listUsers(), api.listTokens(), api.listStudies()])
	);
	return { users, tokens, studies };
};

// The API checks again that the caller is an administrator; a refusal comes back as the form's.
export const actions: Actions = {
	addUser: (event) =>
		answerForm(
			event,
			'user-new',
			async (api, fields) => {
				await api.createUser({
					body: {
						name: fields.text('name'),
						email: fields.text('email'),
						password: fields.text('password'),
						isAdmin: fields.has('isAdmin')
					}
				});
			},
			['password']
		),

	setPassword: (event) =>
		answerForm(
			event,
			'password',
			async (api, fields) => {
				await api.updateUser({ id: fields.text('userId'), body: { password: fields.text('password') } });
			},
			['password']
		)
};
