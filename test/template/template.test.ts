// biome-ignore-all lint/suspicious/noTemplateCurlyInString: CloudFormation's Fn::Sub is written like this
import { describe, expect, it } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { machineOfTemplate } from '../../src/cost/load.ts';
import { metrics } from '../../src/metrics/measurement.ts';
import { keys } from '../../src/store/keys.ts';
import { type Node, ofType, resources, strings, template, templateText } from './template.ts';

const functions = ofType('AWS::Serverless::Function');
const queues = new Map(ofType('AWS::SQS::Queue'));
const bucketName = { 'Fn::Sub': 'tallypost-${DeskName}-${AWS::AccountId}-${AWS::Region}' };
const refOf = (node: Node): string => node.Ref ?? node['Fn::GetAtt']?.[0];

/** Every SQS source of a function: [function, its properties, the source's]. */
const sources = functions.flatMap(([name, properties]) =>
  Object.values(properties.Events ?? {})
    .filter((event: Node) => event.Type === 'SQS')
    .map((event: Node): [string, Node, Node] => [name, properties, event.Properties]),
);

// Rules of the services that a linter does not look at. Source of each: AWS Lambda Developer Guide, "Lambda quotas",
// "Creating and configuring an Amazon SQS event source mapping"; Amazon SQS Developer Guide, "Dead-letter queues".
describe('functions', () => {
  it.each(functions)(
    '%s has memory and time within the service’s bounds, and the runtime of all',
    (_, properties) => {
      expect(properties.MemorySize).toBeGreaterThanOrEqual(128);
      expect(properties.MemorySize).toBeLessThanOrEqual(10_240);
      expect(properties.Timeout).toBeGreaterThan(0);
      expect(properties.Timeout).toBeLessThanOrEqual(900);
      expect(properties.Runtime).toBeUndefined();
      expect(properties.CodeUri).toMatch(/^dist\/functions\/[a-z]+$/);
      expect(properties.Description.length).toBeLessThanOrEqual(256);
    },
  );

  it('run on a runtime that can be created, on arm64, from a file that the bundles are named as', () => {
    expect(template.Globals.Function).toMatchObject({
      Runtime: 'nodejs24.x',
      Architectures: ['arm64'],
      Handler: 'index.handler',
    });
  });

  it.each(functions)('%s writes to a log of its own that is deleted in time', (_, properties) => {
    const log = refOf(properties.LoggingConfig.LogGroup);
    expect(resources[log]).toMatchObject({
      Type: 'AWS::Logs::LogGroup',
      Properties: { RetentionInDays: { Ref: 'LogDays' } },
    });
    // With the JSON format Lambda would wrap lines, and metrics must stand at the root of a line.
    expect(properties.LoggingConfig.LogFormat).toBeUndefined();
    expect(functions.filter(([, other]) => refOf(other.LoggingConfig.LogGroup) === log)).toHaveLength(1);
  });

  it('know the bucket by the name that it has', () => {
    expect(resources.Bucket.Properties.BucketName).toEqual(bucketName);
    expect(template.Globals.Function.Environment.Variables.TALLYPOST_BUCKET).toEqual(bucketName);
  });
});

describe('queues', () => {
  it.each(sources)(
    'of %s are hidden for six timeouts and the window',
    (_, { Timeout }, { Queue, MaximumBatchingWindowInSeconds = 0 }) => {
      const { VisibilityTimeout } = queues.get(refOf(Queue));
      expect(VisibilityTimeout).toBeGreaterThanOrEqual(6 * Timeout + MaximumBatchingWindowInSeconds);
      expect(VisibilityTimeout).toBeLessThanOrEqual(43_200);
    },
  );

  it.each(sources)(
    'of %s have a window when batches are above ten, and say which deliveries failed',
    (_, __, source) => {
      const window = source.MaximumBatchingWindowInSeconds ?? 0;
      if (source.BatchSize > 10) expect(window).toBeGreaterThanOrEqual(1);
      expect(window).toBeLessThanOrEqual(300);
      expect(source.BatchSize).toBeLessThanOrEqual(10_000);
      expect(source.FunctionResponseTypes).toEqual(['ReportBatchItemFailures']);
    },
  );

  it.each(sources)('of %s run at least two functions at the same time', (_, __, { ScalingConfig }) => {
    const most = ScalingConfig.MaximumConcurrency;
    const least = typeof most === 'number' ? most : template.Parameters[most.Ref].MinValue;
    expect(least).toBeGreaterThanOrEqual(2);
  });

  it.each(sources)(
    'of %s give up after five deliveries, into a queue of the stack that keeps for two weeks',
    (_, __, { Queue }) => {
      const { RedrivePolicy, MessageRetentionPeriod } = queues.get(refOf(Queue));
      expect(RedrivePolicy.maxReceiveCount).toBeGreaterThanOrEqual(5);
      const dead = queues.get(refOf(RedrivePolicy.deadLetterTargetArn));
      expect(dead.RedrivePolicy).toBeUndefined();
      expect(dead.MessageRetentionPeriod).toBe(1_209_600);
      expect(dead.MessageRetentionPeriod).toBeGreaterThanOrEqual(MessageRetentionPeriod);
    },
  );

  it.each([...queues])('%s is encrypted', (_, properties) => {
    expect(properties.SqsManagedSseEnabled).toBe(true);
  });

  it.each(ofType('AWS::SQS::QueuePolicy'))(
    '%s lets in this bucket of this account only',
    (_, { PolicyDocument }) => {
      const [statement] = PolicyDocument.Statement;
      expect(PolicyDocument.Statement).toHaveLength(1);
      expect(statement.Condition).toEqual({
        StringEquals: { 'aws:SourceAccount': { Ref: 'AWS::AccountId' } },
        ArnEquals: { 'aws:SourceArn': { 'Fn::Sub': `arn:\${AWS::Partition}:s3:::${bucketName['Fn::Sub']}` } },
      });
    },
  );
});

describe('the bucket', () => {
  const bucket = resources.Bucket.Properties;

  it('is private, encrypted and versioned, and outlives the stack', () => {
    expect(Object.values(bucket.PublicAccessBlockConfiguration)).toEqual([true, true, true, true]);
    expect(bucket.BucketEncryption.ServerSideEncryptionConfiguration).toHaveLength(1);
    expect(bucket.VersioningConfiguration.Status).toBe('Enabled');
    expect(resources.Bucket).toMatchObject({ DeletionPolicy: 'Retain', UpdateReplacePolicy: 'Retain' });
  });

  it('refuses requests without TLS', () => {
    const [statement] = resources.BucketPolicy.Properties.PolicyDocument.Statement;
    expect(statement).toMatchObject({ Effect: 'Deny', Principal: '*', Action: 's3:*' });
    expect(statement.Condition).toEqual({ Bool: { 'aws:SecureTransport': 'false' } });
    expect(statement.Resource).toHaveLength(2);
  });

  it('tells of new messages and confirmations, and not of the copies by which routing writes its decision', () => {
    const told = bucket.NotificationConfiguration.QueueConfigurations.map(
      ({ Event, Queue, Filter }: Node) => [Event, refOf(Queue), Filter.S3Key.Rules[0].Value],
    );
    expect(told).toEqual([
      ['s3:ObjectCreated:Put', 'InboundQueue', keys.inbound],
      ['s3:ObjectCreated:CompleteMultipartUpload', 'InboundQueue', keys.inbound],
      ['s3:ObjectCreated:Put', 'ConfirmationQueue', keys.confirmations],
    ]);
    expect(bucket.NotificationConfiguration.EventBridgeConfiguration.EventBridgeEnabled).toBe(true);
  });

  it('deletes raw messages and what quotes them, refused confirmations, marks, superseded objects and unfinished uploads, and nothing else', () => {
    const rules = bucket.LifecycleConfiguration.Rules;
    const expiring = rules
      .filter((rule: Node) => rule.ExpirationInDays !== undefined)
      .map((rule: Node) => rule.Prefix);
    expect(expiring.sort()).toEqual(
      [
        keys.refusedConfirmations,
        keys.inbound,
        keys.reports,
        keys.settling,
        keys.waiting,
        keys.webhookMarks,
      ].sort(),
    );
    const ofDays = (prefix: string) => rules.find((rule: Node) => rule.Prefix === prefix).ExpirationInDays;
    // A report holds words of messages, the others name them: they may not outlive them.
    for (const prefix of [keys.reports, keys.settling, keys.waiting])
      expect(ofDays(prefix)).toEqual(ofDays(keys.inbound));
    expect(rules.every((rule: Node) => rule.Status === 'Enabled')).toBe(true);
    const superseded = rules.find((rule: Node) => rule.NoncurrentVersionExpiration !== undefined);
    expect(superseded.Prefix).toBeUndefined();
    expect(superseded.AbortIncompleteMultipartUpload.DaysAfterInitiation).toBe(1);
  });
});

describe('mail', () => {
  it('is stored by SES below inbound/ without its own encryption, and from this rule only', () => {
    const { Rule } = resources.ReceiptRule.Properties;
    expect(Rule.Actions).toEqual([
      { S3Action: { BucketName: { Ref: 'Bucket' }, ObjectKeyPrefix: 'inbound/mail/' } },
    ]);
    expect(Rule.ScanEnabled).toBe(true);
    const {
      'Fn::If': [, statement],
    } = resources.BucketPolicy.Properties.PolicyDocument.Statement[1];
    expect(statement.Action).toBe('s3:PutObject');
    expect(statement.Resource).toEqual({ 'Fn::Sub': '${Bucket.Arn}/inbound/mail/*' });
    expect(statement.Condition.ArnLike['aws:SourceArn']['Fn::Sub']).toMatch(
      new RegExp(`receipt-rule/${Rule.Name['Fn::Sub'].replace(/[${}]/g, '\\$&')}$`),
    );
  });

  it('is left alone when no rule set is named', () => {
    expect(resources.ReceiptRule?.Condition).toBe('ReceivesMail');
    expect(template.Parameters.ReceiptRuleSet.Default).toBe('');
  });
});

describe('secrets', () => {
  it('are no parameters, and come from Secrets Manager by reference', () => {
    for (const name of Object.keys(template.Parameters))
      expect(name).not.toMatch(/Key$|Secret$|Password|Token$/);
    const found = [...strings(template)].filter(([path]) =>
      /TALLYPOST_(TOKEN_KEY|WEBHOOK_SECRETS|SETTLE_SECRET)/.test(path),
    );
    expect(found.map(([, text]) => text).sort()).toEqual([
      '{{resolve:secretsmanager:${SettleSecret}:SecretString}}',
      '{{resolve:secretsmanager:${TokenKey}:SecretString}}',
      '{{resolve:secretsmanager:${WebhookSecret}:SecretString}}',
    ]);
  });

  it('of the words is 32 hex digits, as the functions read it, and is never thrown away', () => {
    const { GenerateSecretString: made } = resources.TokenKey.Properties;
    const excluded = new Set(made.ExcludeCharacters);
    const left = [...'abcdefghijklmnopqrstuvwxyz0123456789']
      .filter((letter) => !excluded.has(letter))
      .join('');
    expect(left).toBe('abcdef0123456789');
    expect(made).toMatchObject({
      PasswordLength: 32,
      ExcludePunctuation: true,
      ExcludeUppercase: true,
      RequireEachIncludedType: false,
    });
    expect(resources.TokenKey).toMatchObject({ DeletionPolicy: 'Retain', UpdateReplacePolicy: 'Retain' });
  });
});

describe('policies', () => {
  const roles = ofType('AWS::IAM::Role');

  it.each(roles)('of %s allow named actions on named resources, and trust one service', (_, properties) => {
    expect(properties.ManagedPolicyArns).toBeUndefined();
    const [trust] = properties.AssumeRolePolicyDocument.Statement;
    expect(properties.AssumeRolePolicyDocument.Statement).toHaveLength(1);
    expect(Object.keys(trust.Principal)).toEqual(['Service']);
    for (const { PolicyDocument } of properties.Policies)
      for (const { Action, Resource } of PolicyDocument.Statement) {
        for (const action of [Action].flat()) expect(action).toMatch(/^[a-z0-9]+:[A-Za-z]+$/);
        expect([Resource].flat()).not.toContain('*');
      }
  });

  it.each(['Intake', 'Settle'])('of the open address of %s let anyone call it, by its URL only', (name) => {
    expect(resources[`${name}Function`].Properties.FunctionUrlConfig).toEqual({ AuthType: 'NONE' });
    expect(resources[`${name}InvokePermission`].Properties).toEqual({
      FunctionName: { Ref: `${name}Function` },
      Action: 'lambda:InvokeFunction',
      Principal: '*',
      InvokedViaFunctionUrl: true,
    });
  });

  it('open no other address', () => {
    expect(ofType('AWS::Lambda::Permission')).toHaveLength(2);
    expect(functions.filter(([, properties]) => properties.FunctionUrlConfig !== undefined)).toHaveLength(2);
  });
});

describe('the page for held messages', () => {
  const ofPage = Object.entries(resources).filter(([name]) => name.startsWith('Settle'));

  it('is there only when somebody asks for it, with all that belongs to it', () => {
    expect(template.Parameters.SettlePage.Default).toBe('no');
    expect(ofPage.map(([name, { Condition }]) => [name, Condition])).toEqual(
      ['Secret', 'Function', 'InvokePermission', 'Logs', 'Role', 'ScheduleRole'].map((what) => [
        `Settle${what}`,
        'HasSettlePage',
      ]),
    );
    for (const [name, output] of Object.entries(template.Outputs as Record<string, Node>))
      if (name.startsWith('Settle')) expect(output.Condition).toBe('HasSettlePage');
  });

  it('is named by nothing that is there without it', () => {
    const names = new Set(ofPage.map(([name]) => name));
    const others = Object.entries(resources).filter(([name]) => !names.has(name));
    const found = others.flatMap(([name, resource]) =>
      [...strings(resource)]
        .filter(([path, text]) =>
          path.endsWith('Fn::Sub')
            ? [...names].some((one) => text.includes(`\${${one}`))
            : /(\/Ref|Fn::GetAtt\/0)$/.test(path) && names.has(text),
        )
        .map(([path]) => `${name}${path}`),
    );
    // Errors of its function, when there is one.
    expect(found).toEqual([expect.stringMatching(/^ErrorsAlarm.*\/Fn::If\/1\//)]);
  });

  it('makes the router mark what waits, and only then', () => {
    expect(resources.RouteFunction.Properties.Environment.Variables.TALLYPOST_MARK_WAITING).toEqual({
      Ref: 'SettlePage',
    });
    expect(template.Parameters.SettlePage.AllowedValues).toEqual(['yes', 'no']);
  });

  it('ends what was left lying sooner than an hour, by a schedule that starts nothing else', () => {
    const { Type, Properties } = resources.SettleFunction.Properties.Events.Finish;
    expect(Type).toBe('ScheduleV2');
    expect(Properties.ScheduleExpression).toBe('rate(15 minutes)');
    expect(refOf(Properties.RoleArn)).toBe('SettleScheduleRole');
    const [{ PolicyDocument }] = resources.SettleScheduleRole.Properties.Policies;
    expect(PolicyDocument.Statement).toEqual([
      {
        Effect: 'Allow',
        Action: 'lambda:InvokeFunction',
        Resource: { 'Fn::GetAtt': ['SettleFunction', 'Arn'] },
      },
    ]);
  });

  it('has a secret that its code takes', () => {
    const { PasswordLength } = resources.SettleSecret.Properties.GenerateSecretString;
    expect(PasswordLength).toBeGreaterThanOrEqual(bounds.settleSecretCharsMin);
  });
});

describe('the schedules', () => {
  const schedules = [resources.CompactFunction, resources.ReportFunction].flatMap((one) =>
    Object.entries(one.Properties.Events as Record<string, Node>),
  );

  it.each(schedules)(
    '%s runs in the desk’s zone, is tried again, and leaves what fails where an alarm sees it',
    (_, { Type, Properties }) => {
      expect(Type).toBe('ScheduleV2');
      expect(Properties.ScheduleExpressionTimezone).toEqual({ Ref: 'TimeZone' });
      expect(Properties.RetryPolicy.MaximumRetryAttempts).toBeGreaterThan(0);
      expect(refOf(Properties.DeadLetterConfig.Arn)).toBe('NightDeadLetters');
      expect(refOf(Properties.RoleArn)).toBe('ScheduleRole');
    },
  );

  it('give the compaction an event that it understands', () => {
    const [, { Properties }] = schedules.find(([name]) => name === 'Recount') as [string, Node];
    expect(JSON.parse(Properties.Input)).toEqual({ recount: true });
  });

  it('may start every function that they name, and no other', () => {
    const [invoke] = resources.ScheduleRole.Properties.Policies[0].PolicyDocument.Statement;
    expect(invoke.Action).toBe('lambda:InvokeFunction');
    expect(invoke.Resource.map(refOf).sort()).toEqual(
      functions
        .filter(([, { Events = {} }]) =>
          Object.values(Events as Record<string, Node>).some(
            ({ Type, Properties }) => Type === 'ScheduleV2' && refOf(Properties.RoleArn) === 'ScheduleRole',
          ),
        )
        .map(([name]) => name)
        .sort(),
    );
  });

  it('write the report after the night’s table and the week’s recount, unless somebody changes them', () => {
    const minuteOf = (name: string): number => {
      const [, minute, hour] = /^cron\((\d+) (\d+) /.exec(template.Parameters[name].Default) ?? [];
      return Number(hour) * 60 + Number(minute);
    };
    // A compaction may take 15 minutes.
    expect(minuteOf('RecountSchedule')).toBeGreaterThan(minuteOf('NightSchedule') + 15);
    expect(minuteOf('ReportSchedule')).toBeGreaterThan(minuteOf('RecountSchedule') + 15);
  });
});

describe('alarms', () => {
  const alarms = ofType('AWS::CloudWatch::Alarm');
  /** Name and dimensions of each metric of ours that an alarm looks at. */
  const watched = alarms.flatMap(([, properties]) =>
    [properties, ...(properties.Metrics ?? []).map((one: Node) => one.MetricStat?.Metric)]
      .filter((metric) => metric?.Namespace === 'Tallypost')
      .map(({ MetricName, Dimensions }: Node) => ({ MetricName, Dimensions })),
  );

  it.each(alarms)('%s tells somebody what to do', (_, properties) => {
    expect(properties.AlarmDescription.length).toBeGreaterThan(60);
    expect(properties.AlarmDescription.length).toBeLessThanOrEqual(1024);
    expect(properties.AlarmActions).toEqual([{ Ref: 'AlarmTopic' }]);
    expect(properties.TreatMissingData).toMatch(/^(notBreaching|breaching|ignore)$/);
  });

  it('watch dead letters, age, errors, failures, the held share, missed compactions and reports, and recounts', () => {
    expect(alarms.map(([name]) => name.replace(/Alarm$/, '')).sort()).toEqual([
      'CompactionMissed',
      'ConfirmationAge',
      'ConfirmationDeadLetters',
      'Errors',
      'Failed',
      'HeldShare',
      'InboundAge',
      'InboundDeadLetters',
      'NightDeadLetters',
      'Recount',
      'ReportMissed',
    ]);
  });

  it('watch every queue that keeps what failed, and errors of every function', () => {
    const names = alarms.map(([, properties]) => properties.Dimensions?.[0].Value['Fn::GetAtt']?.[0]);
    for (const queue of [...queues.keys()].filter((name) => name.endsWith('DeadLetters')))
      expect(names).toContain(queue);
    const errors = resources.ErrorsAlarm.Properties.Metrics.slice(1)
      .map((one: Node) => one['Fn::If']?.[1] ?? one)
      .map((one: Node) => refOf(one.MetricStat.Metric.Dimensions[0].Value));
    expect(errors.sort()).toEqual(functions.map(([name]) => name).sort());
  });

  it('look at metrics that the functions write, under the dimension that they write', () => {
    expect(watched.length).toBe(7);
    for (const { MetricName, Dimensions } of watched) {
      expect(Object.keys(metrics)).toContain(MetricName);
      expect(Dimensions).toEqual([{ Name: 'Desk', Value: { Ref: 'Bucket' } }]);
    }
  });

  it.each(['Compaction', 'Report'])(
    'of a missed %s wait for longer than from one night to the next',
    (name) => {
      const { Period, EvaluationPeriods, TreatMissingData } = resources[`${name}MissedAlarm`].Properties;
      expect(Period * EvaluationPeriods).toBe(26 * 3600);
      expect(TreatMissingData).toBe('breaching');
    },
  );

  it('look at as many metrics as their cost is computed from', () => {
    const looked = alarms.flatMap(([, { Metrics = [{ MetricStat: {} }] }]) =>
      Metrics.filter((one: Node) => one.MetricStat !== undefined),
    );
    expect(looked).toHaveLength(machineOfTemplate.alarmMetrics);
  });
});

describe('the dashboard', () => {
  const body = JSON.parse(resources.Dashboard.Properties.DashboardBody['Fn::Sub']);

  it('shows metrics that the functions write', () => {
    const names = body.widgets
      .flatMap((widget: Node) => widget.properties.metrics)
      .filter(([namespace]: Node) => namespace === 'Tallypost' || namespace === '.')
      .map(([, name]: Node) => name);
    expect(names.length).toBeGreaterThan(15);
    for (const name of names) expect(Object.keys(metrics)).toContain(name);
  });

  it('names resources that there are', () => {
    for (const [, name] of resources.Dashboard.Properties.DashboardBody['Fn::Sub'].matchAll(
      /\$\{([A-Za-z]+)[.}]/g,
    ))
      expect(resources[name]).toBeDefined();
  });
});

describe('parameters and outputs', () => {
  it.each(Object.entries(template.Parameters))(
    '%s has a default, an explanation and a place in the form',
    (name, parameter) => {
      const { Default, Description } = parameter as Node;
      expect(Default).toBeDefined();
      expect(Description.length).toBeGreaterThan(10);
      const groups = template.Metadata['AWS::CloudFormation::Interface'].ParameterGroups;
      expect(
        groups.flatMap((group: Node) => group.Parameters).filter((one: string) => one === name),
      ).toHaveLength(1);
    },
  );

  it('say what to do next', () => {
    for (const output of Object.values(template.Outputs))
      expect((output as Node).Description.length).toBeGreaterThan(10);
    expect(Object.keys(template.Outputs)).toEqual(
      expect.arrayContaining(['BucketName', 'IntakeUrl', 'WebhookSecretArn']),
    );
  });

  it('fit into a bucket’s name of 63 characters', () => {
    const longest = new RegExp(template.Parameters.DeskName.AllowedPattern);
    expect(longest.test('a'.repeat(19))).toBe(true);
    expect(longest.test('a'.repeat(20))).toBe(false);
    // tallypost- and the desk, an account of 12 digits, the longest region's name of 14 letters, two hyphens.
    expect('tallypost-'.length + 19 + 1 + 12 + 1 + 'ap-southeast-1'.length).toBeLessThanOrEqual(63);
  });
});

describe('the file', () => {
  it('uses no YAML that CloudFormation does not read', () => {
    // AWS CloudFormation User Guide, "Template formats": aliases and merges are not supported.
    expect(templateText).not.toMatch(/: [&*][a-z]|<<:/i);
  });

  it('refers to resources, parameters and conditions that there are', () => {
    const known = new Set([
      ...Object.keys(resources),
      ...Object.keys(template.Parameters),
      ...Object.keys(template.Conditions),
    ]);
    const named = [...strings(template)].flatMap(([path, text]) => {
      if (path.endsWith('/Ref')) return [text];
      if (/Fn::GetAtt\/0$/.test(path)) return [text];
      if (path.endsWith('Fn::If/0')) return [text];
      if (path.endsWith('Fn::Sub'))
        return [...text.matchAll(/\$\{([A-Za-z]+)/g)].map(([, name]) => name as string);
      return [];
    });
    const made = new Set(['IntakeFunctionUrl', 'SettleFunctionUrl']); // By the transform.
    expect(
      [...new Set(named)].filter((name) => !known.has(name) && !made.has(name) && !name.startsWith('AWS')),
    ).toEqual([]);
  });
});
