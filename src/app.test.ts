import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';

/** The colours of a theme by name, those of the light one where the dark one says nothing. */
function themes(): Record<'light' | 'dark', ReadonlyMap<string, string>> {
	const css = readFileSync('src/app.css', 'utf8');
	const colours = (of: string) =>
		[...of.matchAll(/--color-([\w-]+): (#[0-9a-f]{6});/g)].map(
			([, name = '', value = '']) => [name, value] as const
		);
	const [light = '', rest = ''] = css.split('@media (prefers-color-scheme: dark)', 2);
	const dark = rest.slice(0, rest.indexOf('@media'));
	return {
		light: new Map(colours(light)),
		dark: new Map([...colours(light), ...colours(dark)])
	};
}

/** Relative luminance and contrast as WCAG 2 has them. */
function luminance(hex: string): number {
	const [red = 0, green = 0, blue = 0] = [1, 3, 5].map((at) => {
		const part = parseInt(hex.slice(at, at + 2), 16) / 255;
		return part <= 0.04045 ? part / 12.92 : ((part + 0.055) / 1.055) ** 2.4;
	});
	return 0.2126 * red + 0.7152 * green + 0.0722 * blue;
}

function contrast(one: string, other: string): number {
	const [dark = 0, light = 0] = [luminance(one), luminance(other)].sort((a, b) => a - b);
	return (light + 0.05) / (dark + 0.05);
}

/** What is set on what; axe cannot see through the clipped keys and the hatched tags. */
const TEXT: readonly (readonly [text: string, on: string])[] = [
	...['ink', 'soft', 'primer', 'dye', 'grease'].flatMap((text) =>
		['sheet', 'panel'].map((on): [string, string] => [text, on])
	),
	['on-dye', 'dye'],
	['on-grease', 'grease'],
	['on-primer-fill', 'primer-fill'],
	// A key that does nothing now.
	['sheet', 'soft']
];
const LINES: readonly (readonly [line: string, on: string])[] = [
	['scribe', 'sheet'],
	['scribe', 'panel']
];

describe.each(Object.entries(themes()))('the colours of the %s theme', (_, colours) => {
	const of = (name: string) => {
		const found = colours.get(name);
		if (found === undefined) throw new Error(`no colour is called ${name}`);
		return found;
	};

	it.each(TEXT)('%s on %s is read: 4.5 to 1', (text, on) => {
		expect(contrast(of(text), of(on))).toBeGreaterThanOrEqual(4.5);
	});

	it.each(LINES)('%s on %s is seen: 3 to 1', (line, on) => {
		expect(contrast(of(line), of(on))).toBeGreaterThanOrEqual(3);
	});
});
