import { domainToASCII } from 'node:url';
import { z } from 'zod';

/** RFC 5321: the longest address that a mail can be sent to. */
const LONGEST = 254;
/** Bringing text to NFC can cost the square of its length, so what is far too long is cut before. */
const MOST_READ = 1000;

/**
 * An e-mail address as typed, trimmed. Letters of any script are taken; blanks and control
 * characters are not, so that an address can stand in a mail's header.
 */
export const Email = z
	.string()
	.max(MOST_READ)
	.transform((text) => text.normalize('NFC').trim())
	.pipe(
		z
			.string()
			.max(LONGEST)
			.regex(/^[^\s\p{Cc}@"<>(),:;\\[\]]{1,64}@[^\s\p{Cc}@.]+(?:\.[^\s\p{Cc}@.]+)+$/u)
	);

/**
 * The form in which two spellings of one address are equal; what accounts are found by. Some browsers
 * send a domain with umlauts as it is typed, others in its `xn--` form.
 */
export function emailKey(email: string): string {
	// Lower case can undo the composition, so NFC comes after it.
	const key = email.slice(0, MOST_READ).trim().toLowerCase().normalize('NFC');
	const at = key.lastIndexOf('@');
	const ascii = at === -1 ? '' : domainToASCII(key.slice(at + 1));
	return ascii === '' ? key : key.slice(0, at + 1) + ascii;
}
