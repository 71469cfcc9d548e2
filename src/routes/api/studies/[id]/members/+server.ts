import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { listMembers, putMember } from '$lib/server/services/members';

export const GET = handle(operations.listMembers, ({ access }) => listMembers(access));
export const PUT = handle(operations.putMember, ({ access, body }) => putMember(access, body.email, body.role));
