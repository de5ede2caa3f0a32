/**
 * Every refusal Tallybar can give, each with a code for programs and a sentence for people that says what
 * to do next. Codes are part of the protocol: old phones know them for ever, so a code is never reused or renamed.
 */
import { OWN_REFUSALS, type Refusal } from './own-refusals';

export const REFUSALS = {
	...OWN_REFUSALS,
	// An entry, by its text
	'entry.wrong_build': {
		says: 'This line belongs to another build. It was not added here.',
		entry: 'never'
	},
	// An entry, beside the rest of the log
	'entry.id_conflict': {
		says: 'Another line with the same id but other content is already in the log. The one in the log stays; export this one and write it again.',
		entry: 'never'
	},
	'entry.reference_forward': {
		says: 'This line refers to one that was written after it. Write it again.',
		entry: 'never'
	},
	'entry.reference_elsewhere': {
		says: 'This line refers to one of another seam. Write it again from the seam it belongs to.',
		entry: 'never'
	},
	'entry.n_too_far': {
		says: 'This line is numbered far beyond the log. The owner can look at it and accept it.',
		entry: 'owner'
	},
	'entry.role': {
		says: 'Your role in this build does not include this. The owner can accept the line or change your role.',
		entry: 'owner'
	},
	'entry.server_only': {
		says: 'Only the server writes lines of this kind. Change the crew from the crew page.',
		entry: 'never'
	},
	'entry.forged_author': {
		says: 'This line names somebody else as its author and no seal of theirs covers it.',
		entry: 'never'
	},
	'entry.author_unknown': {
		says: 'The author of this line has never been in the crew of this build.',
		entry: 'never'
	},
	'entry.referent_refused': {
		says: 'This line stands on one that was not accepted. The owner decides on both.',
		entry: 'owner'
	},
	'entry.waits': {
		says: 'This line refers to one that has not arrived. It is taken in by itself when that arrives; if that one is lost, the owner can take it in without.',
		entry: 'owner'
	},
	'entry.discarded': {
		says: 'The owner looked at this line and did not take it into the log. It stays on this device and can be exported.',
		entry: 'never'
	},
	'strike.not_yours': {
		says: 'Only the author or the owner may strike this line.',
		entry: 'owner'
	},
	'strike.verdict': { says: 'Only the inspector who signed may strike a verdict.', entry: 'never' },
	'strike.not_strikable': {
		says: 'A line of this kind cannot be struck. Change the plan or the crew instead.',
		entry: 'never'
	},
	'withdraw.not_possible': {
		says: 'Only notes, photos, voice recordings and names can be withdrawn. Strike this line instead.',
		entry: 'never'
	},
	'crew.removed': {
		says: 'You are no longer in the crew of this build. The line is kept here and with the server; the owner can accept it.',
		entry: 'owner'
	},
	// Seals
	'seal.broken': {
		says: 'The signature over this line does not fit it. It was changed on the way, or another device wrote it.',
		entry: 'never'
	},
	'seal.missing': { says: 'No signature of its device covers this line.', entry: 'never' },
	'device.unknown': {
		says: 'The device that wrote this line has not been enrolled in this build yet. The line waits until it is.',
		entry: 'later'
	},
	'device.carried': {
		says: 'Somebody else brought this line, and the device that wrote it is not enrolled. Ask its author to sign in and import the file; then it is taken in, and what stands on it.',
		entry: 'never'
	},
	'device.other_person': {
		says: 'This device is enrolled for somebody else. Sign in again on this device.',
		entry: 'never'
	},
	'device.enrolled_before': {
		says: 'This device is already enrolled with another key. Sign out on it and sign in again, then it gets a new one.',
		entry: 'never'
	},
	// A whole request
	'request.malformed': {
		says: 'The server could not read this request. Update the app and try again; nothing was lost.',
		status: 400
	},
	'request.too_large': {
		says: 'This is more than the server takes at once. The app sends smaller pieces by itself.',
		status: 413
	},
	'request.origin': {
		says: 'This request did not come from Tallybar’s own page. Open Tallybar and try again.',
		status: 403
	},
	'request.unavailable': {
		says: 'The server cannot take this just now. Nothing was lost; it is tried again.',
		status: 503
	},
	'request.internal': {
		says: 'Something went wrong on the server. Nothing was lost; try again.',
		status: 500
	},
	'request.no_such_page': { says: 'There is nothing at this address.', status: 404 },
	'disk.full': {
		says: 'The server’s disk is full. Your lines stay on this device and go out once there is room.',
		status: 507
	},
	'build.owner_only': { says: 'Only the owner of the build can do this.', status: 403 },
	'history.differs': {
		says: 'The server’s log differs from the one this device knows, as after a restored backup. The app offers again what the server lacks.',
		status: 409
	},
	'session.none': {
		says: 'You are signed out. Sign in again; your lines stay on this device.',
		status: 401
	},
	'session.other_person': {
		says: 'Somebody else is signed in on this browser. Sign in as the person whose log this is.',
		status: 409
	},
	// Accounts
	'account.sign_in': {
		says: 'This e-mail address and password do not go together. Check both and try again.',
		status: 400
	},
	'account.throttled': { says: 'Too many tries. Wait a while and try again.', status: 429 },
	'account.email': {
		says: 'This is not an e-mail address. It looks like name@example.org.',
		status: 400
	},
	'account.email_taken': {
		says: 'There is already an account with this e-mail address. Sign in instead.',
		status: 400
	},
	'account.name': {
		says: 'Write the name your crew knows you by, at most 80 characters.',
		status: 400
	},
	'account.password_short': {
		says: 'Use at least 10 characters. A few unrelated words are easy to remember and hard to guess.',
		status: 400
	},
	'account.password_long': { says: 'Use at most 200 characters.', status: 400 },
	'account.password_common': {
		says: 'This password is among the first anybody would try. Choose another.',
		status: 400
	},
	'account.password_wrong': {
		says: 'The present password is not right. Nothing was changed.',
		status: 400
	},
	'crew.no_account': {
		says: 'Nobody with this e-mail address has an account here. Ask them to register first.',
		status: 400
	},
	'crew.not_in': {
		says: 'This person is not in the crew. Load the crew again to see who is.',
		status: 400
	},
	'crew.already_in': { says: 'This person is already in the crew.', status: 400 },
	'crew.role_unknown': { says: 'Choose builder, inspector or follower.', status: 400 },
	'crew.last_owner': {
		says: 'A build keeps one owner. Hand it over before you leave.',
		status: 400
	},
	'quarantine.not_acceptable': {
		says: 'This line cannot be taken into the log, because its content or signature is broken. It can only be discarded.',
		status: 400
	},
	// The device
	'server.unreachable': {
		says: 'The server cannot be reached. Your lines are on this device and go out when it can.'
	},
	'server.no_answer': {
		says: 'Something other than the Tallybar server answered, as a Wi-Fi sign-in page does. Your lines are on this device and go out when the server answers.'
	},
	'server.failing': {
		says: 'The server reports a fault. Your lines are on this device; it is tried again.'
	},
	'history.broken': {
		says: 'What the server sent does not fit its own chain. Nothing of it was taken; it is asked again. If this stays, tell whoever runs the server.'
	},
	'device.trouble': {
		says: 'The log on this device could not be read just now. Nothing was lost; it is tried again.'
	}
} as const satisfies Record<string, Refusal>;

export type RefusalCode = keyof typeof REFUSALS;

/** What the catalogue says of a code. */
export function refusal(code: RefusalCode): Refusal {
	return REFUSALS[code];
}

/** Is this text one of our codes? A newer server may send one that this app does not know yet. */
export function isRefusalCode(code: string): code is RefusalCode {
	return Object.hasOwn(REFUSALS, code);
}

/** The sentence for people, also for a code this app does not know. */
export function sentence(code: string): string {
	return isRefusalCode(code)
		? REFUSALS[code].says
		: `The server gave a reason this app does not know (${code}). Update the app.`;
}
