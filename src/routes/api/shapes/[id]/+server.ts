import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { getShape } from '$lib/server/services/shapes';

export const GET = handle(operations.getShape, ({ params }) => getShape(params.id));
