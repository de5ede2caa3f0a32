/** Every screen that is audited, and how one gets there. */
import { readdirSync } from 'node:fs';
import { join } from 'node:path';
import type { Locator, Page } from '@playwright/test';
import { EXAMPLE_BUILD } from '../../src/lib/example/ids';
import type { Role } from '../../src/lib/logbook/kinds';
import { ROOT } from '../../src/bin/prepare.js';
import type { Filled } from './fill';

export interface Screen {
	readonly name: string;
	/** The folder it stands in; a route without a screen fails a test. */
	readonly route: string;
	readonly state: 'empty' | 'filled' | 'error';
	/** Who is at it: nobody signed in, somebody without a build, or one of the crew. */
	readonly who: 'nobody' | 'newcomer' | 'crew';
	/** Roles that see it; all when left out. */
	readonly roles?: readonly Role[];
	readonly path: (filled: Filled) => string;
	/** What is done at the address before it is looked at. */
	readonly act?: (page: Page) => Promise<void>;
	/** It is there once this is seen. */
	readonly shows: (page: Page) => Locator;
	/** Used in gloves: all of it, or what is below the header. */
	readonly gloves?: 'body' | 'main';
}

const NEEDS_SERVER = /^\/\(desk\)\/|\/not-accepted$/;
const OWNER: readonly Role[] = ['owner'];
const WRITERS: readonly Role[] = ['owner', 'builder', 'inspector'];
/** An id that nothing has. */
const NONE = '019a0000-0000-7000-8000-000000000000';

const heading = (name: string | RegExp) => (page: Page) =>
	page.getByRole('heading', { name }).first();
const text = (words: string | RegExp) => (page: Page) => page.getByText(words).first();
const press = (name: string | RegExp) => (page: Page) =>
	page.getByRole('button', { name }).first().click();

const ENTRANCES: readonly Screen[] = [
	{
		name: 'front page',
		route: '/',
		state: 'empty',
		who: 'nobody',
		path: () => '/',
		shows: (page) => page.getByRole('heading', { level: 1 })
	},
	{
		name: 'front page, tried',
		route: '/',
		state: 'filled',
		who: 'nobody',
		path: () => '/',
		act: press(/^DRIVEN/),
		shows: text(/: driven$/)
	},
	{
		name: 'the example',
		route: '/(shop)/builds/[build]/wall',
		state: 'filled',
		who: 'nobody',
		path: () => `/builds/${EXAMPLE_BUILD}/wall`,
		shows: text('nothing here leaves this device')
	},
	{
		name: 'the example, about to be left',
		route: '/(shop)/builds/[build]/people',
		state: 'filled',
		who: 'nobody',
		path: () => `/builds/${EXAMPLE_BUILD}/people`,
		act: press('Leave'),
		shows: heading('Leave the example?')
	},
	{
		name: 'sign in',
		route: '/(desk)/sign-in',
		state: 'empty',
		who: 'nobody',
		path: () => '/sign-in',
		shows: heading('Sign in')
	},
	{
		name: 'sign in, refused',
		route: '/(desk)/sign-in',
		state: 'error',
		who: 'nobody',
		path: () => '/sign-in',
		act: async (page) => {
			await page.getByRole('textbox', { name: 'E-mail address' }).fill('nobody@example.org');
			await page.getByRole('textbox', { name: 'Password' }).fill('no such password');
			await press('Sign in')(page);
		},
		shows: (page) => page.getByRole('alert').getByRole('paragraph').first()
	},
	{
		name: 'register',
		route: '/(desk)/register',
		state: 'empty',
		who: 'nobody',
		path: () => '/register',
		shows: heading('Register')
	},
	{
		name: 'register, refused',
		route: '/(desk)/register',
		state: 'error',
		who: 'nobody',
		path: () => '/register',
		act: press('Register'),
		shows: (page) => page.locator('[aria-invalid=true]').first()
	},
	{
		name: 'sign out, nobody signed in',
		route: '/(desk)/sign-out',
		state: 'empty',
		who: 'nobody',
		path: () => '/sign-out',
		shows: text('Nobody is signed in on this browser.')
	},
	{
		name: 'builds, nobody signed in',
		route: '/(shop)/builds',
		state: 'empty',
		who: 'nobody',
		path: () => '/builds',
		shows: heading('Nobody is signed in here')
	},
	{
		name: 'unknown address',
		route: '/',
		state: 'error',
		who: 'nobody',
		path: () => '/no-such-page',
		shows: heading('There is no page here')
	}
];

const WITHOUT_BUILD: readonly Screen[] = [
	{
		name: 'builds, empty',
		route: '/(shop)/builds',
		state: 'empty',
		who: 'newcomer',
		path: () => '/builds',
		shows: heading('Open a build')
	},
	{
		name: 'builds, no name given',
		route: '/(shop)/builds',
		state: 'error',
		who: 'newcomer',
		path: () => '/builds',
		act: press('Open the build'),
		shows: (page) => page.locator('[aria-invalid=true]').first()
	},
	{
		name: 'sync, empty',
		route: '/(shop)/sync',
		state: 'empty',
		who: 'newcomer',
		path: () => '/sync',
		shows: text('No build is on this device yet.')
	},
	{
		name: 'a build that is not here',
		route: '/(shop)/builds/[build]/wall',
		state: 'error',
		who: 'newcomer',
		path: () => `/builds/${NONE}/wall`,
		shows: text('The server does not know it, or you are not in its crew.')
	},
	{
		name: 'crew of a build that is not there',
		route: '/(desk)/builds/[build]/crew',
		state: 'error',
		who: 'newcomer',
		path: () => `/builds/${NONE}/crew`,
		shows: heading('Crew')
	},
	{
		name: 'sign out',
		route: '/(desk)/sign-out',
		state: 'filled',
		who: 'newcomer',
		path: () => '/sign-out',
		shows: (page) => page.getByRole('button', { name: 'Sign out' })
	},
	{
		name: 'account',
		route: '/(desk)/account',
		state: 'filled',
		who: 'newcomer',
		path: () => '/account',
		shows: heading('Change the password')
	},
	{
		name: 'account, refused',
		route: '/(desk)/account',
		state: 'error',
		who: 'newcomer',
		path: () => '/account',
		act: press('Change the password'),
		shows: (page) => page.locator('[aria-invalid=true]').first()
	}
];

const EMPTY_BUILD: readonly Screen[] = [
	{
		name: 'wall, empty',
		route: '/(shop)/builds/[build]/wall',
		state: 'empty',
		who: 'crew',
		path: ({ empty }) => `/builds/${empty}/wall`,
		shows: (page) => page.getByRole('link', { name: 'Wall' })
	},
	{
		name: 'plan, empty',
		route: '/(shop)/builds/[build]/plan',
		state: 'empty',
		who: 'crew',
		path: ({ empty }) => `/builds/${empty}/plan`,
		shows: text('Here stand the assemblies')
	},
	{
		name: 'bench list, empty',
		route: '/(shop)/builds/[build]/bench',
		state: 'empty',
		who: 'crew',
		path: ({ empty }) => `/builds/${empty}/bench`,
		gloves: 'main',
		shows: text('No seam is planned yet.')
	},
	{
		name: 'logbook, empty',
		route: '/(shop)/builds/[build]/logbook',
		state: 'empty',
		who: 'crew',
		path: ({ empty }) => `/builds/${empty}/logbook`,
		shows: heading('Logbook')
	},
	{
		name: 'not accepted, empty',
		route: '/(shop)/builds/[build]/not-accepted',
		state: 'empty',
		who: 'crew',
		path: ({ empty }) => `/builds/${empty}/not-accepted`,
		shows: text(/Nothing waits for your decision|Every line of this device was accepted/)
	}
];

/** The bench of one seam: at the same address, one after the other. */
const bench = (
	screen: Pick<Screen, 'name' | 'shows'> & Partial<Pick<Screen, 'act' | 'roles' | 'state'>>
): Screen => ({
	route: '/(shop)/builds/[build]/bench/[seam]',
	state: 'filled',
	who: 'crew',
	path: ({ build, seam }) => `/builds/${build}/bench/${seam}`,
	gloves: 'body',
	...screen
});
const sheet = (name: string, key: string | RegExp, title: string): Screen =>
	bench({ name, act: press(key), roles: WRITERS, shows: inSheet(title) });
const inSheet = (title: string) => (page: Page) =>
	page.getByRole('dialog').getByRole('heading', { name: title });

const AT_THE_BENCH: readonly Screen[] = [
	bench({ name: 'bench', shows: text(/of 64 driven/) }),
	bench({
		name: 'bench, a run driven',
		roles: WRITERS,
		act: async (page) => {
			await press(/^driven \+/i)(page);
			await page.getByRole('button', { name: /^undo \d/ }).waitFor();
			// What answers for a moment covers the screen.
			await page.locator('.bg-primer-fill.fixed').waitFor({ state: 'detached' });
		},
		shows: text(/of 64 driven/)
	}),
	sheet('bench, defect', 'DEFECT', 'Defect'),
	bench({
		name: 'bench, defect, nothing chosen',
		state: 'error',
		roles: WRITERS,
		act: async (page) => {
			await press('DEFECT')(page);
			await press('Note the defect')(page);
		},
		shows: text('Choose the holes first.')
	}),
	bench({
		name: 'bench, put right',
		roles: WRITERS,
		act: async (page) => {
			await press('DEFECT')(page);
			await press(/7–8 · tipped/)(page);
			await page.getByRole('radio', { name: /^replaced, next size up/ }).check();
		},
		shows: (page) => page.getByRole('textbox', { name: /Part number of the new rivet/ })
	}),
	sheet('bench, left open', 'left open', 'Left open'),
	sheet('bench, drilled out', 'drilled out', 'Drilled out'),
	bench({ name: 'bench, pick', act: press('pick holes'), shows: inSheet('Pick holes') }),
	bench({
		name: 'bench, pick, no such hole',
		state: 'error',
		act: async (page) => {
			await press('pick holes')(page);
			await page.getByRole('spinbutton', { name: 'Last' }).fill('999');
			await press('Pick these')(page);
		},
		shows: text('This seam has the holes 1 to 64.')
	}),
	bench({ name: 'bench, how and who', act: press(/^How and who/), shows: inSheet('How and who') }),
	bench({
		name: 'bench, a hole picked',
		act: press(/^hole \d+:/),
		shows: text('Tap another for a range.')
	}),
	bench({ name: 'bench, to settle', act: press(/to settle/), shows: inSheet('To settle') }),
	{
		name: 'bench of a seam that is not here',
		route: '/(shop)/builds/[build]/bench/[seam]',
		state: 'error',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/bench/${NONE}`,
		gloves: 'body',
		shows: heading('This seam is not on this device')
	}
];

const plan = (
	name: string,
	search: (filled: Filled) => string,
	more: Pick<Screen, 'shows'> & Partial<Pick<Screen, 'roles' | 'act' | 'state'>>
): Screen => ({
	name,
	route: '/(shop)/builds/[build]/plan',
	state: 'filled',
	who: 'crew',
	path: (filled) => `/builds/${filled.build}/plan?${search(filled)}`,
	...more
});

const FILLED_BUILD: readonly Screen[] = [
	{
		name: 'builds',
		route: '/(shop)/builds',
		state: 'filled',
		who: 'crew',
		path: () => '/builds',
		act: async (page) => {
			await page.getByText('Open another build').click();
		},
		shows: (page) => page.getByRole('button', { name: 'Open the build' })
	},
	{
		name: 'wall',
		route: '/(shop)/builds/[build]/wall',
		state: 'filled',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/wall`,
		shows: heading('Left elevator')
	},
	{
		name: 'plan',
		route: '/(shop)/builds/[build]/plan',
		state: 'filled',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/plan`,
		shows: heading('Left elevator')
	},
	plan('plan of a seam', ({ seam }) => `seam=${seam}`, { shows: heading('Skin to spar, lower') }),
	plan('plan of an assembly', ({ assembly }) => `assembly=${assembly}`, {
		shows: heading('Left elevator')
	}),
	plan('plan, a new seam', ({ assembly }) => `new-seam=${assembly}`, {
		roles: WRITERS,
		shows: (page) => page.getByRole('textbox', { name: 'Name' })
	}),
	plan('plan, a new seam, refused', ({ assembly }) => `new-seam=${assembly}`, {
		state: 'error',
		roles: WRITERS,
		act: async (page) => {
			await page.locator('form button.key').last().click();
		},
		shows: (page) => page.locator('[aria-invalid=true]').first()
	}),
	plan('plan, a new assembly', () => 'new-assembly', {
		roles: WRITERS,
		shows: (page) => page.getByRole('textbox', { name: 'Name' })
	}),
	plan('plan, about the build', () => 'the-build', { shows: (page) => page.locator('#the-build') }),
	{
		name: 'bench list',
		route: '/(shop)/builds/[build]/bench',
		state: 'filled',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/bench`,
		gloves: 'main',
		shows: heading('Left elevator')
	},
	...AT_THE_BENCH,
	{
		name: 'logbook',
		route: '/(shop)/builds/[build]/logbook',
		state: 'filled',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/logbook`,
		shows: text(/^driven/)
	},
	{
		name: 'crew, from the device',
		route: '/(shop)/builds/[build]/people',
		state: 'filled',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/people`,
		shows: heading('Crew')
	},
	{
		name: 'logbook of a seam',
		route: '/(shop)/builds/[build]/logbook',
		state: 'filled',
		who: 'crew',
		path: ({ build, seam }) => `/builds/${build}/logbook?seam=${seam}`,
		shows: text(/driven 1–12/)
	},
	{
		name: 'one line',
		route: '/(shop)/builds/[build]/logbook/[entry]',
		state: 'filled',
		who: 'crew',
		path: ({ build, line }) => `/builds/${build}/logbook/${line}`,
		shows: heading('What stands on it')
	},
	{
		name: 'one line, struck without a reason',
		route: '/(shop)/builds/[build]/logbook/[entry]',
		state: 'error',
		who: 'crew',
		roles: OWNER,
		path: ({ build, line }) => `/builds/${build}/logbook/${line}`,
		act: press('Strike it'),
		shows: text('Choose why.')
	},
	{
		name: 'a line that is not here',
		route: '/(shop)/builds/[build]/logbook/[entry]',
		state: 'error',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/logbook/${NONE}`,
		shows: text('This line is not on this device.')
	},
	{
		name: 'sync',
		route: '/(shop)/sync',
		state: 'filled',
		who: 'crew',
		path: () => '/sync',
		shows: heading('Yarrow Two')
	},
	{
		name: 'not accepted',
		route: '/(shop)/builds/[build]/not-accepted',
		state: 'filled',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/not-accepted`,
		shows: text(/driven 30–34|Every line of this device was accepted/)
	},
	{
		name: 'crew',
		route: '/(desk)/builds/[build]/crew',
		state: 'filled',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/crew`,
		shows: heading('Crew')
	},
	{
		name: 'crew, refused',
		route: '/(desk)/builds/[build]/crew',
		state: 'error',
		who: 'crew',
		roles: OWNER,
		path: ({ build }) => `/builds/${build}/crew`,
		act: press('Add to the crew'),
		shows: (page) => page.getByRole('alert').getByRole('paragraph').first()
	}
];

export const SCREENS: readonly Screen[] = [
	...ENTRANCES,
	...WITHOUT_BUILD,
	...EMPTY_BUILD,
	...FILLED_BUILD
];

/** What is asked for with no network: by their addresses, as they come from the device. */
export const OFFLINE: readonly Screen[] = [
	...SCREENS.filter(
		({ who, route, act, state }) =>
			who === 'crew' && act === undefined && state === 'filled' && !NEEDS_SERVER.test(route)
	),
	{
		name: 'not accepted',
		route: '/(shop)/builds/[build]/not-accepted',
		state: 'error',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/not-accepted`,
		shows: text(/needs a network|Every line of this device was accepted/)
	},
	{
		name: 'crew',
		route: '/(desk)/builds/[build]/crew',
		state: 'error',
		who: 'crew',
		path: ({ build }) => `/builds/${build}/crew`,
		shows: text('there is no answer from it')
	},
	{
		name: 'account',
		route: '/(desk)/account',
		state: 'error',
		who: 'newcomer',
		path: () => '/account',
		shows: text('there is no answer from it')
	},
	{
		name: 'builds, nobody signed in',
		route: '/(shop)/builds',
		state: 'error',
		who: 'nobody',
		path: () => '/builds',
		shows: heading('Nobody is signed in here')
	}
];

/** Shows itself only in place of others. */
export const NEVER_ALONE: readonly string[] = ['/shell'];

/** Every route with a page to look at. */
export function pagesOfTheApp(): string[] {
	const page = /(?:^|\/)\+page\.svelte$/;
	return readdirSync(join(ROOT, 'src/routes'), { recursive: true, encoding: 'utf8' })
		.map((file) => file.replaceAll('\\', '/'))
		.filter((file) => page.test(file))
		.map((file) => `/${file.replace(page, '')}`)
		.sort();
}
