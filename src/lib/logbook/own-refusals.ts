/**
 * The refusals a device gives by itself, before any server is asked. Apart from the rest of the catalogue, because the
 * bench says no others: what is here every page of the shop loads.
 */
export interface Refusal {
	/** What happened, what was kept, what to do. */
	readonly says: string;
	/**
	 * For an entry only. `never`: sending it again cannot help; the phone keeps it, shows it and does not count it.
	 * `owner`: the server keeps it and the owner may accept it. `later`: nothing is wrong with the entry, the phone
	 * goes on offering it.
	 */
	readonly entry?: 'never' | 'owner' | 'later';
	/** HTTP status when the whole request is refused with it. */
	readonly status?: number;
}

export const OWN_REFUSALS = {
	// A line, by its text
	'entry.not_canonical': {
		says: 'This line is not written in the one form the log uses, so it cannot be told apart from a copy. Export it and report it.',
		entry: 'never'
	},
	'entry.malformed': {
		says: 'Something in this line is missing or out of range. Write it again from the screen it belongs to.',
		entry: 'never'
	},
	'entry.unknown_field': {
		says: 'This line carries a field the log does not know. Update the app that wrote it.',
		entry: 'never'
	},
	'entry.unknown_kind': {
		says: 'This line was written by a newer app than the server knows. It stays on this device and goes out once the server is updated.',
		entry: 'later'
	},
	'entry.too_large': {
		says: 'This line is larger than the log takes. Split it into shorter ones.',
		entry: 'never'
	},
	'entry.identity': {
		says: 'A new build, assembly or seam carries the id of the line that makes it; this one does not. Write it again.',
		entry: 'never'
	},
	'entry.concerns': {
		says: 'This line does not say which seam or assembly it concerns, or says one it cannot. Write it again from that screen.',
		entry: 'never'
	},
	'strike.settles_itself': { says: 'A strike cannot keep the line it strikes.', entry: 'never' },
	// A build
	'build.unknown': {
		says: 'The server does not know this build, or you are not in its crew. Your lines stay on this device.',
		status: 404
	},
	'build.removed': {
		says: 'You are no longer in the crew of this build. What is on this device stays readable.',
		status: 403
	},
	// The device
	'device.full': {
		says: 'This device has no room left. Nothing was saved. Free some space, then do it again.'
	},
	'device.store_closed': {
		says: 'The log on this device could not be opened. Close other Tallybar tabs and reload; nothing was lost.'
	},
	'device.store_lost': {
		says: 'This browser would not keep the line. Nothing was saved. Reload the page and do it again.'
	},
	'device.other_person_signed_in': {
		says: 'Somebody else is signed in. What you log stays on this device until you sign in again.'
	},
	// A file
	'file.not_ours': {
		says: 'This is not a Tallybar export. Choose a file that ends in .tallybar.json.'
	},
	'file.damaged': {
		says: 'This file was changed after it was written. Nothing was taken from it. Ask for a new export.'
	},
	'file.other_build': { says: 'This file belongs to a build that is not on this device.' },
	'file.seal_missing': {
		says: 'Some lines in this file carry no signature of the device that wrote them. Nothing was taken from it.'
	}
} as const satisfies Record<string, Refusal>;

export type OwnRefusalCode = keyof typeof OWN_REFUSALS;

/** The sentence for people. */
export function ownSentence(code: OwnRefusalCode): string {
	return OWN_REFUSALS[code].says;
}
