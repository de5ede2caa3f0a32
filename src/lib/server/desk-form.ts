import { fail } from '@sveltejs/kit';
import type { ActionFailure, RequestEvent } from '@sveltejs/kit';
import { z } from 'zod';
import { refusal } from '../logbook/refusals';
import type { Refused } from './auth/accounts';

/** A text field of a form; one that is missing, or is a file, counts as left empty. */
export const field = z.string().catch('');

export interface Failed<Typed> {
	/** What is wrong and what to do, in words. */
	says: string;
	/** The field to say it beside; null: above the form. */
	field: Refused['field'] | null;
	/** What was typed, to stand in the form again. Never a password. */
	typed: Typed;
}

/** The form again, with the reason it was refused and what was typed. */
export function failed<Typed>(
	event: Pick<RequestEvent, 'setHeaders'>,
	{ code, field, retryAfter }: Refused,
	typed: Typed
): ActionFailure<Failed<Typed>> {
	const { says, status = 400 } = refusal(code);
	if (retryAfter !== undefined) event.setHeaders({ 'retry-after': String(retryAfter) });
	const wait = retryAfter === undefined ? '' : ` ${waitInWords(retryAfter)}`;
	return fail(status, { says: says + wait, field: field ?? null, typed });
}

function waitInWords(seconds: number): string {
	if (seconds < 60) return 'It opens again within a minute.';
	const minutes = Math.ceil(seconds / 60);
	return `It opens again in ${minutes} ${minutes === 1 ? 'minute' : 'minutes'}.`;
}
