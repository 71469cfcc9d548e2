import { fail, redirect } from '@sveltejs/kit';
import { ApiProblem } from '$lib/api/client';
import { type LengthUnit } from '$lib/api/schemas/common';
import { objectiveCreate, type Sense } from '$lib/api/schemas/studies';
import { answerForm, FormReader } from '$lib/api/server';
import type { Actions } from './$types';

const MOST_ROWS = 20;

/** Rows of objectives in the form; a row without a name is left out. */
function rowsOf(fields: FormReader): number {
	return Math.min(MOST_ROWS, Math.max(1, Number(fields.text('rows')) || 1));
}

function objectivesOf(fields: FormReader) {
	const given = [];
	for (let i = 0; i < rowsOf(fields); i++) {
		const name = fields.text(`objective${i}.name`);
		if (!name) {
			if (fields.text(`objective${i}.unit`)) fields.refuse(`objective${i}.name`, 'needs a name');
			continue;
		}
		const parsed = objectiveCreate.safeParse({
			name,
			unit: fields.text(`objective${i}.unit`),
			sense: fields.text(`objective${i}.sense`) as Sense,
			weight: fields.number(`objective${i}.weight`) ?? 1
		});
		if (parsed.success) given.push(parsed.data);
		else for (const issue of parsed.error.issues) fields.refuse(`objective${i}.${issue.path.join('.')}`, issue.message);
	}
	return given;
}

export const actions: Actions = {
	create: async (event) => {
		const outcome = await answerForm(event, 'create', async (api, fields) => {
			const body = {
				name: fields.text('name'),
				lengthUnit: fields.text('lengthUnit') as LengthUnit,
				referenceArea: fields.number('referenceArea') ?? undefined,
				density: fields.number('density') ?? undefined,
				speed: fields.number('speed') ?? undefined,
				note: fields.optionalText('note')
			};
			if (!body.name) fields.refuse('name', 'needs a name');
			const objectives = objectivesOf(fields);
			fields.check();
			const study = await api.createStudy({ body });
			let missing = 0;
			for (const objective of objectives) {
				try {
					await api.createObjective({ id: study.id, body: objective });
				} catch (cause) {
					if (!(cause instanceof ApiProblem)) throw cause;
					missing += 1;
				}
			}
			return { id: study.id, missing };
		});
		if (!('id' in outcome)) return outcome;
		redirect(
			303,
			outcome.missing ? `/studies/${outcome.id}/study?missing=${outcome.missing}#objectives` : `/studies/${outcome.id}`
		);
	},

	// One more row of objectives, for browsers without scripts.
	row: async ({ request }) => {
		const fields = new FormReader(await request.formData());
		return fail(422, {
			form: 'row',
			beside: true,
			title: '',
			detail: '',
			mend: undefined,
			fields: {} as Record<string, string>,
			values: { ...fields.values, rows: String(Math.min(MOST_ROWS, rowsOf(fields) + 1)) } as Record<string, string>
		});
	}
};
