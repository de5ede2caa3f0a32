/** The words of the trade on our screens, for what the log says in codes. */
import type { Entry, When } from '$lib/logbook/entry';
import type { Body, Length, Role } from '$lib/logbook/kinds';

export { FAULT_WORDS, METHOD_WORDS, numbersText, stamped } from './rivet-words';

export const FIX_WORDS: Readonly<Record<Body<'defect.fixed'>['action'], string>> = {
	left_as_is: 'left as is',
	driven_further: 'driven further',
	replaced: 'replaced',
	replaced_oversize: 'replaced, next size up',
	referred: 'referred'
};

export const BASIS_WORDS: Readonly<Record<NonNullable<Body<'defect.fixed'>['basis']>, string>> = {
	drawings: 'the drawings',
	manufacturer: 'the manufacturer',
	authority: 'the authority',
	inspector: 'the inspector',
	own_judgement: 'own judgement'
};

export const DECISION_WORDS: Readonly<Record<Body<'defect.decided'>['decision'], string>> = {
	leave: 'leave as is',
	drive_further: 'drive further',
	replace: 'replace',
	replace_oversize: 'replace, next size up',
	refer: 'refer',
	no_defect: 'no defect'
};

export const STRIKE_WORDS: Readonly<Record<Body<'entry.struck'>['reason'], string>> = {
	undo: 'undo',
	wrong_holes: 'wrong holes',
	wrong_seam: 'wrong seam',
	not_done: 'not done',
	logged_twice: 'logged twice',
	other: 'other'
};

export const ROLE_WORDS: Readonly<Record<Role, string>> = {
	owner: 'owner',
	builder: 'builder',
	inspector: 'Inspector (mechanic or mentor)',
	follower: 'follower'
};

/** The clock on the wall where a line was written: "21:40". */
export function clock(at: string): string {
	return at.slice(11, 16);
}

const MONTHS = [
	'January',
	'February',
	'March',
	'April',
	'May',
	'June',
	'July',
	'August',
	'September',
	'October',
	'November',
	'December'
];
const DAYS = ['Sunday', 'Monday', 'Tuesday', 'Wednesday', 'Thursday', 'Friday', 'Saturday'];

/** `2026-03-14` as "Saturday 14 March 2026", `2026-03` as "March 2026". */
export function dayText(date: string): string {
	const [year, month, day] = date.split('-').map(Number);
	if (month === undefined) return String(year);
	const name = MONTHS[month - 1] ?? '';
	if (day === undefined) return `${name} ${year}`;
	const weekday = DAYS[new Date(`${date.slice(0, 10)}T00:00:00Z`).getUTCDay()] ?? '';
	return `${weekday} ${day} ${name} ${year}`;
}

/** The time meant, where it is not the time of writing. */
export function whenText(when: When): string {
	switch (when.is) {
		case 'exact':
			return `late, for ${dayText(when.at.slice(0, 10))} ${clock(when.at)}`;
		case 'about':
			return `late, for about ${dayText(when.date)}`;
		case 'before':
			return when.source === undefined
				? 'before this log began'
				: `before this log began, ${when.source}`;
	}
}

/** How far a device's clock may be from the server's before a line says so. */
const CLOCK_DIFFERS = 10 * 60_000;

/** Was the line received before it was written, by more than ten minutes? Later is no fault: it waited for a network. */
export function clockAhead(at: string, received: number | undefined): boolean {
	return received !== undefined && Date.parse(at) - received > CLOCK_DIFFERS;
}

/** A length in the unit it was typed in. */
export function lengthText({ nm, unit }: Length): string {
	if (unit === 'mm') return `${trimmed(nm / 1_000_000, 2)} mm`;
	if (unit === 'in') return `${trimmed(nm / 25_400_000, 4).replace(/^0/, '')} in`;
	const sixtyFourths = nm / 396_875;
	if (!Number.isInteger(sixtyFourths)) return `${trimmed(nm / 25_400_000, 4)} in`;
	const whole = Math.floor(sixtyFourths / 64);
	let [over, under] = [sixtyFourths % 64, 64];
	while (over > 0 && over % 2 === 0) [over, under] = [over / 2, under / 2];
	const fraction = over > 0 ? `${over}/${under}` : '';
	return `${[whole > 0 || !fraction ? String(whole) : '', fraction].filter(Boolean).join(' ')} in`;
}

function trimmed(value: number, digits: number): string {
	return String(Number(value.toFixed(digits)));
}

export function found(reading: Entry<'reading.taken'>['body']['found']): string {
	if (reading.by === 'gauge')
		return { inside: 'inside by gauge', small: 'too small by gauge', big: 'too big by gauge' }[
			reading.size
		];
	if (reading.by === 'eye') return reading.seated ? 'seated, by eye' : 'not seated, by eye';
	const sizes = [
		reading.width && `${lengthText(reading.width)} wide`,
		reading.height && `${lengthText(reading.height)} high`,
		reading.uncertainty && `± ${lengthText(reading.uncertainty)}`
	].filter(Boolean);
	return `${sizes.join(', ') || 'measured'} by ${reading.by}`;
}
