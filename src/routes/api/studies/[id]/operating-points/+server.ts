import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { createOperatingPoint } from '$lib/server/services/studies';

export const POST = handle(operations.createOperatingPoint, ({ access, body }) => createOperatingPoint(access, body));
