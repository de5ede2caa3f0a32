/**
 * The pages that only the server can draw (`routes/(desk)`). The service worker asks the network
 * for them first; every other page it answers with the shell. A desk page missing here would be
 * drawn from the shell and lose its server data on a full load.
 */
const DESK_PATHS: readonly RegExp[] = [
	/^\/sign-in$/,
	/^\/sign-out$/,
	/^\/register$/,
	/^\/account(\/|$)/,
	/^\/builds\/[^/]+\/crew$/
];

export function isDeskPath(pathname: string): boolean {
	return DESK_PATHS.some((desk) => desk.test(pathname));
}
