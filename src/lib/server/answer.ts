import { json } from '@sveltejs/kit';
import { refusal } from '../logbook/refusals';
import type { RefusalCode } from '../logbook/refusals';

export interface AnswerExtra {
	requestId?: string;
	/** Whole seconds, sent as Retry-After. */
	retryAfter?: number;
	/** Instead of the status in the catalogue. */
	status?: number;
	headers?: Record<string, string>;
}

/**
 * A whole request refused, as every /api route says it: `{code, says, requestId}` (ErrorAnswer in
 * logbook/wire.ts) under the status of the catalogue, 400 when it names none.
 */
export function refuse(code: RefusalCode, extra: AnswerExtra = {}): Response {
	const { says, status = 400 } = refusal(code);
	const { requestId, retryAfter } = extra;
	return json(
		{ code, says, ...(requestId !== undefined && { requestId }) },
		{
			status: extra.status ?? status,
			headers: {
				...extra.headers,
				...(retryAfter !== undefined && { 'Retry-After': String(retryAfter) })
			}
		}
	);
}
