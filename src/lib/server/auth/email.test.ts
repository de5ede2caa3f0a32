import { describe, expect, it } from 'vitest';
import { Email, emailKey } from './email';

describe('an e-mail address', () => {
	it.each(['erna@example.org', ' erna+shop@mail.example.org ', 'jürgen@flügel.example'])(
		'is taken as typed, trimmed: %s',
		(typed) => {
			expect(Email.parse(typed)).toBe(typed.trim());
		}
	);

	it.each([
		'',
		'erna',
		'erna@',
		'@example.org',
		'erna@localhost',
		'er na@example.org',
		'erna@example..org',
		'erna@example.org\r\nBcc: all@example.org',
		'erna@example.org, otto@example.org',
		'Erna <erna@example.org>',
		`${'e'.repeat(65)}@example.org`,
		`erna@${'a'.repeat(250)}.org`,
		`${'̀'.repeat(100_000)}@example.org`
	])('is refused when a letter could not be sent to it: %j', (typed) => {
		expect(Email.safeParse(typed).success).toBe(false);
	});

	it('is one account in every spelling', () => {
		const key = emailKey('jürgen@xn--flgel-lva.example');
		expect(emailKey(' Jürgen@FLÜGEL.example '.normalize('NFD'))).toBe(key);
		expect(emailKey('juergen@flügel.example')).not.toBe(key);
	});
});
