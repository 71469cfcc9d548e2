/** The contract’s rows of studies, their objectives and operating points. */
import { z } from 'zod';
import {
	objective,
	objectiveCreate,
	objectiveUpdate,
	operatingPoint,
	operatingPointCreate,
	study,
	studyCreate,
	studySummary,
	studyUpdate
} from '../schemas/studies';
import { op, type Operation } from './operation';

export const studiesOperations = {
	listStudies: op({
		method: 'GET',
		path: '/api/studies',
		summary: 'The studies you are a member of',
		access: 'user',
		subject: 'none',
		status: 200,
		answer: z.array(studySummary)
	}),
	createStudy: op({
		method: 'POST',
		path: '/api/studies',
		summary: 'Make a study; its maker becomes its engineer',
		access: 'user',
		subject: 'none',
		body: studyCreate,
		status: 201,
		answer: study
	}),
	getStudy: op({
		method: 'GET',
		path: '/api/studies/{id}',
		summary: 'A study with its objectives, operating points and boxes',
		access: 'viewer',
		subject: 'study',
		status: 200,
		answer: study
	}),
	updateStudy: op({
		method: 'PATCH',
		path: '/api/studies/{id}',
		summary: 'Change a study’s name, note or reference values',
		access: 'engineer',
		subject: 'study',
		body: studyUpdate,
		status: 200,
		answer: study
	}),
	createObjective: op({
		method: 'POST',
		path: '/api/studies/{id}/objectives',
		summary: 'Add an objective',
		access: 'engineer',
		subject: 'study',
		body: objectiveCreate,
		status: 201,
		answer: objective
	}),
	updateObjective: op({
		method: 'PATCH',
		path: '/api/objectives/{id}',
		summary: 'Change an objective’s name, sense or weight',
		access: 'engineer',
		subject: 'objective',
		body: objectiveUpdate,
		status: 200,
		answer: objective
	}),
	createOperatingPoint: op({
		method: 'POST',
		path: '/api/studies/{id}/operating-points',
		summary: 'Add an operating point',
		access: 'engineer',
		subject: 'study',
		body: operatingPointCreate,
		status: 201,
		answer: operatingPoint
	})
} satisfies Record<string, Operation>;
