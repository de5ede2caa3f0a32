import { z } from 'zod';

/** RFC 5321: the longest address that a mail can be sent to. */
const LONGEST = 254;

/**
 * An e-mail address as typed, trimmed. Letters of any script are taken; blanks and control
 * characters are not, so that an address can stand in a mail's header.
 */
export const Email = z
	.string()
	.transform((text) => text.normalize('NFC').trim())
	.pipe(
		z
			.string()
			.max(LONGEST)
			// eslint-disable-next-line no-control-regex
			.regex(/^[^\s@"<>(),:;\\[\]\u0000-\u001f\u007f]{1,64}@[^\s@.\u0000-\u001f\u007f]+(?:\.[^\s@.\u0000-\u001f\u007f]+)+$/u)
	);

/** The form in which two spellings of one address are equal; what accounts are found by. */
export function emailKey(email: string): string {
	// Lower case can undo the composition, so NFC comes last.
	return email.trim().toLowerCase().normalize('NFC');
}
