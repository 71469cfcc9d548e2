/** The contract’s rows of shapes, their maps, moves, results and files. */
import { z } from 'zod';
import { jobAccepted } from '../schemas/jobs';
import { mapImportQuery, rehearsalRequest, result, resultCreate } from '../schemas/maps';
import { moveAnswer, moveRequest, recipeRequest } from '../schemas/moves';
import { shape, shapeImportQuery, shapeSummary, stlQuery } from '../schemas/shapes';
import { op, type Operation } from './operation';

export const shapesOperations = {
	listShapes: op({
		method: 'GET',
		path: '/api/studies/{id}/shapes',
		summary: 'All shapes of a study, by number',
		access: 'viewer',
		subject: 'study',
		status: 200,
		answer: z.array(shapeSummary)
	}),
	importShape: op({
		method: 'POST',
		path: '/api/studies/{id}/shapes',
		summary: 'Upload a surface (STL); the job’s result is {shapeId}',
		access: 'engineer',
		subject: 'study',
		query: shapeImportQuery,
		body: 'bytes',
		status: 202,
		answer: jobAccepted
	}),
	getShape: op({
		method: 'GET',
		path: '/api/shapes/{id}',
		summary: 'A shape',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: shape
	}),
	getPositions: op({
		method: 'GET',
		path: '/api/shapes/{id}/positions',
		summary: 'Vertices: float32 x, y, z little-endian, in the study’s length unit',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: 'bytes'
	}),
	getTriangles: op({
		method: 'GET',
		path: '/api/topologies/{id}/triangles',
		summary: 'Triangles: three uint32 vertex numbers each, little-endian, counter-clockwise from outside',
		access: 'viewer',
		subject: 'topology',
		status: 200,
		answer: 'bytes'
	}),
	getOriginal: op({
		method: 'GET',
		path: '/api/shapes/{id}/files/original',
		summary: 'The upload, byte for byte',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: 'bytes'
	}),
	getStl: op({
		method: 'GET',
		path: '/api/shapes/{id}/files/stl',
		summary: 'The shape as STL, in the study’s length unit',
		access: 'viewer',
		subject: 'shape',
		query: stlQuery,
		status: 200,
		answer: 'bytes'
	}),
	getObj: op({
		method: 'GET',
		path: '/api/shapes/{id}/files/obj',
		summary: 'The shape as OBJ, in the study’s length unit',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: 'bytes'
	}),
	getPly: op({
		method: 'GET',
		path: '/api/shapes/{id}/files/ply',
		summary: 'The shape as PLY, in the study’s length unit, with the displacement from its parent as an array',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: 'bytes'
	}),
	getVtp: op({
		method: 'GET',
		path: '/api/shapes/{id}/files/vtp',
		summary:
			'The shape as VTK XML PolyData, in the study’s length unit, with the displacement from its parent as an array',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: 'bytes'
	}),
	getHandover: op({
		method: 'GET',
		path: '/api/shapes/{id}/files/handover',
		summary: 'A zip for the solver: the STL, the recipe and a readable account of the move',
		access: 'viewer',
		subject: 'shape',
		status: 200,
		answer: 'bytes'
	}),
	importMap: op({
		method: 'POST',
		path: '/api/shapes/{id}/sensitivities',
		summary: 'Upload a sensitivity map (CSV: x,y,z,sensitivity or x,y,z,gx,gy,gz)',
		access: 'engineer',
		subject: 'shape',
		query: mapImportQuery,
		body: 'bytes',
		status: 202,
		answer: jobAccepted
	}),
	getMapValues: op({
		method: 'GET',
		path: '/api/maps/{id}/values',
		summary: 'The map as a density at vertices, for display: float32 little-endian, per metre outward per square metre',
		access: 'viewer',
		subject: 'map',
		status: 200,
		answer: 'bytes'
	}),
	previewMove: op({
		method: 'POST',
		path: '/api/shapes/{id}/moves/preview',
		summary: 'What a move would do',
		access: 'viewer',
		subject: 'shape',
		body: recipeRequest,
		status: 200,
		answer: moveAnswer
	}),
	commitMove: op({
		method: 'POST',
		path: '/api/shapes/{id}/moves',
		summary: 'Make the move: the job’s result is the new shape and what the preview answers',
		access: 'engineer',
		subject: 'shape',
		body: moveRequest,
		status: 202,
		answer: jobAccepted
	}),
	rehearse: op({
		method: 'POST',
		path: '/api/shapes/{id}/rehearsals',
		summary: 'Compute the rehearsal objectives of a shape: a result and a map each, marked as rehearsed',
		access: 'engineer',
		subject: 'shape',
		body: rehearsalRequest,
		status: 202,
		answer: jobAccepted
	}),
	createResult: op({
		method: 'POST',
		path: '/api/shapes/{id}/results',
		summary: 'What the solver found; a correction is a new row',
		access: 'engineer',
		subject: 'shape',
		body: resultCreate,
		status: 201,
		answer: result
	})
} satisfies Record<string, Operation>;
