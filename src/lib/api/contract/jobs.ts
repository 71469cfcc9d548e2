/** The contract’s rows of jobs, and the installation itself. */
import { z } from 'zod';
import { health } from '../schemas/common';
import { job } from '../schemas/jobs';
import { op, type Operation } from './operation';

export const jobsOperations = {
	health: op({
		method: 'GET',
		path: '/api/health',
		summary: 'Is it up',
		access: 'public',
		subject: 'none',
		status: 200,
		answer: health
	}),
	openapi: op({
		method: 'GET',
		path: '/api/openapi.json',
		summary: 'This description',
		access: 'public',
		subject: 'none',
		status: 200,
		answer: z.record(z.string(), z.unknown())
	}),
	getJob: op({
		method: 'GET',
		path: '/api/jobs/{id}',
		summary: 'A job',
		access: 'viewer',
		subject: 'job',
		status: 200,
		answer: job
	}),
	watchJob: op({
		method: 'GET',
		path: '/api/jobs/{id}/events',
		summary: 'A job’s progress as server-sent events: each `data` is the job',
		access: 'viewer',
		subject: 'job',
		status: 200,
		answer: 'events'
	}),
	cancelJob: op({
		method: 'POST',
		path: '/api/jobs/{id}/cancel',
		summary: 'Stop a job; nothing of it stays',
		access: 'engineer',
		subject: 'job',
		status: 200,
		answer: job
	})
} satisfies Record<string, Operation>;
