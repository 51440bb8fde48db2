/** A desk's file to begin with: to be edited, but valid as it stands. */
export const starterDesk = {
  version: 1,
  name: 'Our desk',
  timeZone: 'UTC',
  ownAddresses: [],
  ownDomains: [],
  queues: [
    { id: 'billing', title: 'Bills and payments' },
    { id: 'support', title: 'Help with the product' },
    { id: 'complaints', title: 'Complaints', wrongRouteMinutes: 25 },
    { id: 'other', title: 'Everything else' },
  ],
  costs: { lookMinutes: 2, wrongRouteMinutes: 15 },
  senderClasses: [],
  references: [],
  forms: [],
  fields: [],
  guards: [{ id: 'danger-to-life', queue: 'complaints', phrases: ['danger to life', 'end my life'] }],
  auditShare: 0.02,
  halfLifeDays: null,
} as const;
