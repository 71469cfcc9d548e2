import type { LengthUnit, Role } from '$lib/api/schemas/common';
import type { Rehearsal, Sense } from '$lib/api/schemas/studies';
import { answerForm } from '$lib/api/server';
import { metresPerUnit } from '$lib/format/units';
import type { Actions } from './$types';

export const actions: Actions = {
	update: (event) =>
		answerForm(event, 'study', async (api, fields) => {
			const body = {
				name: fields.text('name'),
				note: fields.text('note'),
				referenceArea: fields.number('referenceArea'),
				density: fields.number('density'),
				speed: fields.number('speed')
			};
			fields.check();
			await api.updateStudy({ id: event.params.study, body });
		}),

	symmetry: (event) =>
		answerForm(event, 'symmetry', async (api, fields) => {
			const axis = fields.text('axis');
			const unit = metresPerUnit[fields.text('unit') as LengthUnit];
			const at = axis === 'none' ? 0 : fields.number('at');
			if (at === null) fields.refuse('at', 'needs a number');
			fields.check();
			const along = (x: number) => ['x', 'y', 'z'].map((name) => (name === axis ? x : 0)) as [number, number, number];
			const symmetry = axis === 'none' ? null : { point: along(at! * unit), normal: along(1) };
			await api.updateStudy({ id: event.params.study, body: { symmetry } });
		}),

	addObjective: (event) =>
		answerForm(event, 'objective-new', async (api, fields) => {
			const body = {
				name: fields.text('name'),
				unit: fields.text('unit'),
				sense: fields.text('sense') as Sense,
				weight: fields.number('weight') ?? 1
			};
			fields.check();
			await api.createObjective({ id: event.params.study, body });
		}),

	addRehearsal: (event) =>
		answerForm(event, 'rehearsal-new', async (api, fields) => {
			const kind = fields.text('kind') as Rehearsal['kind'];
			const [sign, axis] = fields.text('flow');
			const direction = ['x', 'y', 'z'].map((a) => (a === axis ? (sign === '-' ? -1 : 1) : 0)) as [
				number,
				number,
				number
			];
			const stagnation = fields.number('stagnation') ?? undefined;
			const body = {
				name: fields.text('name'),
				unit: '',
				sense: fields.text('sense') as Sense,
				weight: fields.number('weight') ?? 1,
				rehearsal: {
					kind,
					...(kind === 'frontalArea' || kind === 'impactDrag' ? { direction } : {}),
					...(kind === 'impactDrag' ? { stagnation } : {})
				}
			};
			fields.check();
			await api.createObjective({ id: event.params.study, body });
		}),

	updateObjective: async (event) => {
		const id = event.url.searchParams.get('id') ?? '';
		return answerForm(event, `objective-${id}`, async (api, fields) => {
			const body = {
				name: fields.text('name'),
				sense: fields.text('sense') as Sense,
				weight: fields.number('weight') ?? undefined
			};
			if (body.weight === undefined) fields.refuse('weight', 'needs a number');
			fields.check();
			await api.updateObjective({ id, body });
		});
	},

	addPoint: (event) =>
		answerForm(event, 'point-new', async (api, fields) => {
			const body = {
				name: fields.text('name'),
				speed: fields.number('speed') ?? undefined,
				density: fields.number('density') ?? undefined,
				yaw: fields.number('yaw') ?? undefined,
				weight: fields.number('weight') ?? 1
			};
			fields.check();
			await api.createOperatingPoint({ id: event.params.study, body });
		}),

	addMember: (event) =>
		answerForm(event, 'member-new', async (api, fields) => {
			await api.putMember({
				id: event.params.study,
				body: { email: fields.text('email'), role: fields.text('role') as Role }
			});
		}),

	changeMember: async (event) => {
		const email = event.url.searchParams.get('email') ?? '';
		return answerForm(event, `member-${email}`, async (api, fields) => {
			await api.putMember({ id: event.params.study, body: { email, role: fields.text('role') as Role } });
		});
	}
};
