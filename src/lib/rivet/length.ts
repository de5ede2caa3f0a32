/**
 * Lengths as people type and read them. Kept as whole nanometres, in which every size of the trade is exact, together
 * with the unit typed, so that a drawing in fractions reads back in fractions.
 */

/** 1/64 in, .001 in and .01 mm in nanometres. Exact: an inch is 25.4 mm by definition (international yard, 1959). */
export const NM_PER_64TH = 396_875;
export const NM_PER_THOU = 25_400;
export const NM_PER_CENTIMILLIMETRE = 10_000;

const NM = { in: 25_400_000, mm: 1_000_000 } as const;
/** The longest that fits an entry: 100 m. */
const LONGEST_NM = 100_000_000_000;
const DENOMINATORS = [2, 4, 8, 16, 32, 64];

/** Nanometres (0 to 100 m) and how it was typed: inch fraction, decimal inch or millimetre. */
export interface Length {
	nm: number;
	unit: 'frac' | 'in' | 'mm';
}

export type LengthRead =
	| { readonly ok: true; readonly length: Length }
	/** What was read, and what would do. */
	| { readonly ok: false; readonly says: string };

const FRACTION = /^(?:(\d{1,9})(?:\s*-\s*|\s+))?(\d{1,3})\s*\/\s*(\d{1,4})$/;
const WHOLE = /^\d{1,9}$/;
const DECIMAL = /^(\d{0,9})([.,])(\d{1,9})$/;
const UNIT = /\s*(″|"|”|''|inch(?:es)?|in\.?|mm)$/i;
/** ½ and its like as a keyboard of a phone offers them; `1½` is one and a half. */
const VULGAR = /[\u00bc-\u00be\u2150-\u215e]/g;

/**
 * Reads `1-3/8"`, `1 3/8`, `.040`, `0.040 in`, `1.2 mm`, `1,2 mm`. Fractions are of an inch, by halves down to 64ths.
 * Decimals go down to the nanometre.
 * @param bare the unit of a number without one: that of the build
 */
export function parseLength(text: string, bare: 'in' | 'mm' = 'in'): LengthRead {
	const typed = text.trim();
	const refuse = (why: string): LengthRead => ({ ok: false, says: why });
	if (typed === '') return refuse('Nothing was typed. Write a length like 3/8, .040 or 1.2 mm.');
	const shown = `“${typed.length > 24 ? `${typed.slice(0, 24)}…` : typed}”`;

	const plain = typed.replace(
		VULGAR,
		(sign) => ` ${sign.normalize('NFKC').replace('\u2044', '/')}`
	);
	const suffix = UNIT.exec(plain)?.[1];
	const number = plain.replace(UNIT, '').trim();
	const unit = suffix === undefined ? undefined : /^mm$/i.test(suffix) ? 'mm' : 'in';

	const fraction = FRACTION.exec(number);
	if (fraction) {
		const [, whole, over, under] = fraction;
		if (unit === 'mm')
			return refuse(`${shown} is a fraction in millimetres. Write a decimal, like 1.2 mm.`);
		if (!DENOMINATORS.includes(Number(under)))
			return refuse(
				`${shown} is a fraction over ${under}. Write halves, 4ths, 8ths, 16ths, 32nds or 64ths, or a decimal like .040.`
			);
		return inRange(Number(whole ?? 0) + Number(over) / Number(under), 'frac', shown);
	}
	if (WHOLE.test(number)) {
		// A whole number of inches is read as the fraction it would be written as.
		const as = unit ?? bare;
		return inRange(Number(number), as === 'in' ? 'frac' : 'mm', shown);
	}
	const decimal = DECIMAL.exec(number);
	if (decimal) {
		const [, whole, mark, digits] = decimal;
		if (mark === ',' && digits?.length === 3 && whole !== '' && Number(whole) > 0)
			return refuse(
				`${shown} could be ${whole}.${digits} or ${whole}${digits}. Write it with a point, or without the comma.`
			);
		return inRange(Number(`${whole || '0'}.${digits}`), unit ?? bare, shown);
	}
	return refuse(
		number.startsWith('-')
			? `${shown} is less than nothing. Write a length like 3/8, .040 or 1.2 mm.`
			: `${shown} is not a length. Write one like 1-3/8, .040 in or 1.2 mm.`
	);
}

function inRange(value: number, unit: Length['unit'], shown: string): LengthRead {
	const nm = Math.round(value * NM[unit === 'mm' ? 'mm' : 'in']);
	return nm <= LONGEST_NM
		? { ok: true, length: { nm, unit } }
		: { ok: false, says: `${shown} is more than 100 m. Check the number and its unit.` };
}

/**
 * A length in its own unit: `1-3/8 in` (to the nearest 1/64), `.040 in`, `1.2 mm`. Decimals are exact where two more
 * places than .001 in, or one more than .01 mm, can say it (`.3125 in`); otherwise to the nearest .001 in or .01 mm.
 */
export function formatLength({ nm, unit }: Length): string {
	switch (unit) {
		case 'frac':
			return `${fractionText(Math.round(nm / NM_PER_64TH))} in`;
		case 'in':
			return `${decimalText(nm, NM.in, 3, 5).replace(/^0\./, '.')} in`;
		case 'mm':
			return `${decimalText(nm, NM.mm, 2, 3).replace(/\.?0+$/, '')} mm`;
	}
}

function fractionText(sixtyFourths: number): string {
	const whole = Math.floor(sixtyFourths / 64);
	let over = sixtyFourths % 64;
	if (over === 0) return String(whole);
	let under = 64;
	while (over % 2 === 0) {
		over /= 2;
		under /= 2;
	}
	return `${whole === 0 ? '' : `${whole}-`}${over}/${under}`;
}

/** With the fewest places from `least` to `most` that say it exactly; rounded to `least` places where none does. */
function decimalText(nm: number, perUnit: number, least: number, most: number): string {
	let places = least;
	while (places < most && nm % (perUnit / 10 ** places) !== 0) places++;
	if (nm % (perUnit / 10 ** places) !== 0) places = least;
	// Rounded as a whole number first: toFixed would round the binary fraction.
	const steps = Math.round(nm / (perUnit / 10 ** places));
	const digits = String(steps).padStart(places + 1, '0');
	return `${digits.slice(0, -places)}.${digits.slice(-places)}`;
}
