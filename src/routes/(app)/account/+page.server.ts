import { answerForm, loadFrom } from '$lib/api/server';
import { asTheme, THEME_COOKIE } from '$lib/state/theme';
import type { Actions, PageServerLoad } from './$types';

export const load: PageServerLoad = async ({ fetch, cookies, locals }) => {
	const [tokens, studies] = await loadFrom(fetch, (api) => Promise.all([api.listTokens(), api.listStudies()]));
	return {
		tokens: tokens.filter((token) => token.owner.id === locals.user?.id),
		studies,
		theme: asTheme(cookies.get(THEME_COOKIE))
	};
};

export const actions: Actions = {
	createToken: (event) =>
		answerForm(event, 'token-new', async (api, fields) => {
			const created = await api.createToken({
				body: { name: fields.text('name'), studyId: fields.optionalText('studyId') }
			});
			return { created: { name: created.name, token: created.token } };
		})
};
