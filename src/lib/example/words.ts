/** What the invented crew has at hand and says. */
import type { Fault } from '$lib/logbook/kinds';

type Some<T> = readonly [T, ...T[]];

/** Common practice: gun by rivet diameter (32nds of an inch), and where the pressure begins. */
export const TOOLS: Readonly<Record<number, { readonly gun: string; readonly psi: string }>> = {
	3: { gun: '3X', psi: '38' },
	4: { gun: '3X', psi: '42' },
	5: { gun: '4X', psi: '50' },
	6: { gun: '4X', psi: '60' }
};

export const BARS: Some<{ readonly name: string; readonly lb: string }> = [
	{ name: 'steel block', lb: '1.5' },
	{ name: 'tungsten bar', lb: '2.1' },
	{ name: 'footed bar', lb: '1.2' },
	{ name: 'long bar', lb: '2.5' }
];

/** Default limits of a driven head (practice: 1.4 to 1.75 D wide, at least 0.4 D high), in .001 in. */
export const LIMITS: Readonly<Record<number, readonly [number, number, number]>> = {
	3: [131, 164, 38],
	4: [175, 219, 50],
	5: [219, 273, 63],
	6: [263, 328, 75]
};

export const FAULTS_SEEN: Some<readonly [Fault, string?]> = [
	['tipped', 'Bar was not square.'],
	['smile', 'Set walked off the head.'],
	['smile'],
	['gap', 'Feeler goes under a third of the head.'],
	['under_driven'],
	['over_driven', 'Held the trigger a beat too long.'],
	['proud'],
	['sheets_apart', 'Cleco was missing next to it.'],
	['off_centre'],
	['cracked', 'A hairline on the rim of the driven head.'],
	['enlarged_hole', 'Drill walked when the last one came out.'],
	['bent_over']
];

export const LEFT_OPEN: Some<string> = [
	'The bar does not go in beside the bracket',
	'Cleco stays until the next skin is on',
	'Hole wants the longer rivet, none left',
	'Waits for the clip that shares this hole'
];

export const NOTES: Some<string> = [
	'6 °C in the hangar. The compressor took its time.',
	'New set of clecos arrived, the old ones go to the practice box.',
	'Two strips tonight before we liked the pressure.',
	'Radio on, nobody talked, best evening in weeks.',
	'The footed bar is the one for this corner.',
	'Ran out of light behind the spar; the head lamp lives on the bench now.',
	'Skin had a little oil-can between ribs, gone after the row.',
	'Checked the drawing again: the row starts inboard.',
	'Swept up. Found the missing bit under the jig.',
	'Tape on the set again, no more marks on the heads.',
	'Stopped early, hands were done.',
	'Borrowed the long bar, give it back on Sunday.',
	'The dimples needed another push before they sat flat.',
	'Half of the row went in without a pause.'
];

export const CHEERS: Some<string> = [
	'It looks like a wing now!',
	'Dinner is at eight, not at ten.',
	'Showed the photos at work, they want to see it.',
	'How many are left?',
	'I can hold the bar on Saturday.'
];

export const CHANGES: Some<string> = [
	'Drawing revision B read: pitch as before, note added',
	'Start from the middle and work outward',
	'Drive every third first, then fill in'
];

export const ANSWERED = 'The answer came: drill it out, look at the hole, drive another';
export const REFERRED = 'Picture sent to the kit maker, waiting for an answer';
