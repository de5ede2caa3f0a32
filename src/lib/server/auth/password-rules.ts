import { ZxcvbnFactory } from '@zxcvbn-ts/core';
import { adjacencyGraphs, dictionary } from '@zxcvbn-ts/language-common';

/** Counted in characters as people count them (code points of the NFC form). */
const LEAST = 10;
const MOST = 200;

/**
 * The estimate reads so much of a password. It grows with the square of the length, on the thread
 * that answers everybody; nothing this long is weak unless it repeats itself, which its start shows.
 */
const ESTIMATED = 40;
/** zxcvbn: guessed within 10^8 tries that begin with the likeliest. */
const WEAK = 2;
/** A shorter local part (as in al@…) stands in too many honest passwords by chance. */
const LEAST_LOCAL_PART = 4;

/**
 * Bringing text to NFC can cost the square of its length, so what is far too long is cut before. No
 * text so long is brought below the 200 characters by it.
 */
const MOST_READ = 2000;

/**
 * The password in the form that is compared, hashed and counted: NFC, since keyboards differ in how
 * they compose an umlaut; not trimmed, and cut only far beyond the longest that can be had.
 */
export function readable(password: string): string {
	return password.slice(0, MOST_READ).normalize('NFC');
}

let estimator: ZxcvbnFactory | undefined;

export type PasswordProblem =
	'account.password_short' | 'account.password_long' | 'account.password_common';

/**
 * What is wrong with a password somebody wants to have, or undefined. There are no rules about kinds
 * of characters: only the length, and not what everybody, or whoever knows the e-mail address, would
 * try first.
 */
export function passwordProblem(password: string, emailKey: string): PasswordProblem | undefined {
	const text = readable(password);
	const { length } = Array.from(text);
	if (length < LEAST) return 'account.password_short';
	if (length > MOST) return 'account.password_long';

	const lower = text.toLowerCase();
	const local = emailKey.slice(0, Math.max(0, emailKey.lastIndexOf('@')));
	if (lower.includes('tallybar')) return 'account.password_common';
	if (local.length >= LEAST_LOCAL_PART && lower.includes(local)) return 'account.password_common';
	// The dictionary takes some megabytes and 50 ms: not before the first person needs it.
	estimator ??= new ZxcvbnFactory({
		dictionary,
		graphs: adjacencyGraphs,
		l33tMaxSubstitutions: 20
	});
	const { score } = estimator.check(text.slice(0, ESTIMATED), [emailKey, local]);
	return score <= WEAK ? 'account.password_common' : undefined;
}
