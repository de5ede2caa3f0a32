/** What to say when a page that only the server draws could not be shown. Pure. */

export interface DeskErrorText {
	readonly title: string;
	readonly happened: string;
	/** What is safe, or what to do. */
	readonly then: readonly string[];
	/** The build of the address, to go back to. */
	readonly build: string | undefined;
	readonly again: boolean;
}

const TITLES: readonly (readonly [RegExp, string])[] = [
	[/^\/builds\/[^/]+\/crew$/, 'Crew'],
	[/^\/account(\/|$)/, 'Account'],
	[/^\/sign-in$/, 'Sign in'],
	[/^\/sign-out$/, 'Sign out'],
	[/^\/register$/, 'Register']
];

const SAFE = 'What you logged is kept on this device, and the bench works without a network.';

/**
 * @param answered whether the server itself said so; a dead server and no network say nothing
 * @param says its sentence for people
 */
export function deskErrorText(
	path: string,
	{ status, answered, says }: { status: number; answered: boolean; says: string }
): DeskErrorText {
	const title = TITLES.find(([of]) => of.test(path))?.[1] ?? 'This page';
	const build = /^\/builds\/([^/]+)\//.exec(path)?.[1];
	if (!answered)
		return {
			title,
			happened: 'This page comes from the server, and there is no answer from it.',
			then: [SAFE, 'With a network, try again.'],
			build,
			again: true
		};
	if (status >= 500) return { title, happened: says, then: [SAFE], build, again: true };
	// What the server says of a build it does not know says what is safe already.
	const then =
		status === 404 && build !== undefined
			? ['A build that was opened without a network is known there once its lines have gone out.']
			: [SAFE];
	return { title, happened: says, then, build, again: false };
}
