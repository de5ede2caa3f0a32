/** The small values entries are made of. Frozen with the kinds that use them. */
import * as z from 'zod/mini';

/** UUID v7 in lower case (RFC 9562): made on the device, sortable by the time the device believed in. */
const UUID_V7 = /^[0-9a-f]{8}-[0-9a-f]{4}-7[0-9a-f]{3}-[89ab][0-9a-f]{3}-[0-9a-f]{12}$/;
export const Id = z.string().check(z.regex(UUID_V7));

/** SHA-256 as 43 characters of base64url. */
export const Hash = z.string().check(z.regex(/^[A-Za-z0-9_-]{43}$/));

/** A P-256 public key, uncompressed point (65 bytes) as base64url. */
export const PublicKey = z.string().check(z.regex(/^[A-Za-z0-9_-]{87}$/));

/** An ECDSA P-256 signature, r and s (64 bytes, IEEE P1363) as base64url. */
export const Signature = z.string().check(z.regex(/^[A-Za-z0-9_-]{86}$/));

/** Trimmed text of 1 to `most` UTF-16 units, without control characters other than line feed. */
// eslint-disable-next-line no-control-regex
const CONTROL = /[\u0000-\u0009\u000b-\u001f\u007f]/;
export const text = (most: number) =>
	z.string().check(
		z.minLength(1),
		z.maxLength(most),
		z.refine((value) => value.trim() === value && !CONTROL.test(value))
	);

export const whole = (least: number, most: number) => z.int().check(z.gte(least), z.lte(most));

/**
 * A day that is in the calendar (Gregorian, 1900 to 2999). Written out, because `Date.parse` is lenient about days that
 * are not, each engine in its own way: one phone would call malformed what another wrote and the server took.
 */
const DAY = /^(19|2\d)\d\d-(0[1-9]|1[0-2])-(0[1-9]|[12]\d|3[01])$/;
const DAYS = [31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31];
function isDay(text: string): boolean {
	if (!DAY.test(text)) return false;
	const [year = 0, month = 0, day = 0] = text.split('-').map(Number);
	const leap = year % 4 === 0 && (year % 100 !== 0 || year % 400 === 0);
	return day <= (month === 2 && leap ? 29 : (DAYS[month - 1] ?? 0));
}

/** Wall time with offset and milliseconds, as the device's clock had it: `2026-12-01T21:40:05.120+01:00`. */
const TIME_OF_DAY = /^T([01]\d|2[0-3]):[0-5]\d:[0-5]\d\.\d{3}[+-](0\d|1[0-4]):[0-5]\d$/;
export const WallTime = z
	.string()
	.check(z.refine((value) => isDay(value.slice(0, 10)) && TIME_OF_DAY.test(value.slice(10))));

/** A calendar day. */
export const Day = z.string().check(z.refine(isDay));

/** The time meant, where it is not the time of writing. */
export const When = z.discriminatedUnion('is', [
	z.strictObject({ is: z.literal('exact'), at: WallTime }),
	/** A day, a month or a year. */
	z.strictObject({
		is: z.literal('about'),
		date: z.string().check(
			z.regex(/^\d{4}(-\d\d(-\d\d)?)?$/),
			z.refine((date) => isDay(date + '-01-01'.slice(date.length - 4)))
		)
	}),
	/** Before this log began; `source` says where it was written down, e.g. "paper page 12". */
	z.strictObject({ is: z.literal('before'), source: z.optional(text(120)) })
]);

/** Nanometres: 1/64 in = 396,875; .001 in = 25,400; .01 mm = 10,000. At most 100 m. */
const nanometres = whole(0, 100_000_000_000);

/** A length and the unit it was typed in: inch fraction, decimal inch, or millimetre. */
export const Length = z.strictObject({ nm: nanometres, unit: z.enum(['frac', 'in', 'mm']) });

/** A decimal number as typed. */
export const Decimal = z.string().check(z.regex(/^-?\d{1,9}(\.\d{1,6})?$/));

/** Pressure, weight, torque and the like, exactly as typed: a decimal number and its unit. */
export const Quantity = z.strictObject({
	text: Decimal,
	unit: text(16)
});

/** A rivet's part number as read, trimmed. Nothing parsed is stored. */
export const Callout = text(64);

const Prep = z.enum(['plain', 'dimple', 'countersunk', 'countersunk_under_dimple', 'double_flush']);

/** One sheet of a stack. The first is the one under the manufactured head. */
const Sheet = z.strictObject({
	thickness: Length,
	material: z.optional(text(32)),
	prep: Prep,
	part: z.optional(text(80))
});
export const Stack = z.array(Sheet).check(z.minLength(1), z.maxLength(8));

export const Method = z.enum([
	'driven',
	'squeezed',
	'back_riveted',
	'pulled',
	'screw',
	'bolt',
	'not_recorded'
]);
/** A method that can be planned; "not recorded" is only for what was done before this log began. */
export const PlannedMethod = z.enum([
	'driven',
	'squeezed',
	'back_riveted',
	'pulled',
	'screw',
	'bolt'
]);

/** The most holes of a seam, and of one line: ten times the longest row there is. Bounds what a hostile line can cost. */
export const MOST_HOLES = 5000;
const index = whole(1, MOST_HOLES);

/**
 * Holes by identity: the line that added them (left out for those the seam was planned with) and their
 * index in it, from 1. Ascending and apart, so that one set of holes has one writing.
 */
export const HoleRange = z
	.strictObject({ by: z.optional(Id), from: index, to: index })
	.check(z.refine((range) => range.from <= range.to));
export const Holes = z.array(HoleRange).check(
	z.minLength(1),
	z.maxLength(400),
	z.refine((ranges) => {
		let named = 0;
		for (let i = 0; i < ranges.length; i++) {
			const range = ranges[i] as { by?: string | undefined; from: number; to: number };
			const before = ranges[i - 1];
			named += range.to - range.from + 1;
			if (!before) continue;
			const [a, b] = [before.by ?? '', range.by ?? ''];
			// Adjacent ranges would be one: {1-5, 6-9} is written {1-9}.
			if (a > b || (a === b && before.to + 1 >= range.from)) return false;
		}
		return named <= MOST_HOLES;
	})
);

export const Role = z.enum(['owner', 'builder', 'inspector', 'follower']);
