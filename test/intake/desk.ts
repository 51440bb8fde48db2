import type { IntakeSettings } from '../../src/desk/intake-settings.ts';

/** The intake of the invented Fenmark Water, as tests use it. */
export const settings: IntakeSettings = {
  origins: ['https://www.fenmarkwater.example'],
  forms: [
    {
      id: 'contact',
      fields: [
        { name: 'topic', isRequired: true, charactersMax: 40, values: ['bill', 'leak', 'other'] },
        { name: 'email', isRequired: false, charactersMax: 254, values: null },
        { name: 'message', isRequired: true, charactersMax: 5000, values: null },
      ],
      senderField: 'email',
      trapField: 'website',
      shownAtField: 'shownAt',
      secondsMin: 3,
      onSuspect: 'hold',
      thanksUrl: null,
    },
    {
      id: 'meter',
      fields: [{ name: 'reading', isRequired: true, charactersMax: 12, values: null }],
      senderField: null,
      trapField: 'website',
      shownAtField: 'shownAt',
      secondsMin: 2,
      onSuspect: 'refuse',
      thanksUrl: 'https://www.fenmarkwater.example/thanks',
    },
  ],
  confirmations: {
    message: '/case/externalId',
    queue: '/case/team/name',
    by: '/actor/login',
    at: '/occurredAt',
    queueNames: { 'Billing Team': 'billing' },
  },
};

export const queues = new Set(['billing', 'leaks-and-bursts']);
