/** A small invented set for each language: what a customer writes and how mail clients of that language introduce what
 *  they quote (wording of common clients, from memory). */
export interface LanguageSample {
  readonly language: string;
  /** What this writer wrote, two lines. */
  readonly own: string;
  /** Words of it that must be found in the text. */
  readonly words: readonly string[];
  /** Earlier text, to be quoted. */
  readonly earlier: string;
  /** Lines that introduce a quotation. */
  readonly attributions: readonly string[];
  /** Banner above a forwarded or original message. */
  readonly banners: readonly string[];
  /** A header as printed above a quoted message. */
  readonly printedHeader: string;
  /** What a phone adds as its last line. */
  readonly deviceLine: string;
  /** Charsets besides UTF-8 in which the text can be written, with their labels. */
  readonly charsets: readonly string[];
}

export const languageSamples: readonly LanguageSample[] = [
  {
    language: 'English',
    own: 'The meter at our new house shows the wrong reading.\nPlease correct the last bill.',
    words: ['meter', 'reading', 'bill'],
    earlier: 'Which address is it about?',
    attributions: [
      'On Tue, 3 Mar 2026 at 10:15, Fenmark Water <help@fenmarkwater.example> wrote:',
      'On 3 Mar 2026, at 10:15, Fenmark Water\n<help@fenmarkwater.example> wrote:',
      'On 03/03/2026 10:15, Fenmark Water wrote:',
      'Fenmark Water <help@fenmarkwater.example> writes:',
    ],
    banners: [
      '-----Original Message-----',
      '---------- Forwarded message ---------',
      'Begin forwarded message:',
    ],
    printedHeader: 'From: Fenmark Water\nSent: 3 March 2026 10:15\nTo: Anna Berg\nSubject: Your meter',
    deviceLine: 'Sent from my phone',
    charsets: ['us-ascii', 'iso-8859-1'],
  },
  {
    language: 'German',
    own: 'Der Zähler im neuen Haus zeigt einen falschen Stand.\nBitte berichtigen Sie die letzte Rechnung.',
    words: ['Zähler', 'falschen', 'Rechnung'],
    earlier: 'Um welche Anschrift geht es?',
    attributions: [
      'Am Di., 3. März 2026 um 10:15 Uhr schrieb Fenmark Water <help@fenmarkwater.example>:',
      'Am 03.03.2026 um 10:15 schrieb Fenmark Water:',
      'Fenmark Water <help@fenmarkwater.example> schrieb am 3. März 2026 um 10:15:',
    ],
    banners: [
      '-----Ursprüngliche Nachricht-----',
      '---------- Weitergeleitete Nachricht ----------',
      'Anfang der weitergeleiteten Nachricht:',
    ],
    printedHeader:
      'Von: Fenmark Water\nGesendet: Dienstag, 3. März 2026 10:15\nAn: Anna Berg\nBetreff: Ihr Zähler',
    deviceLine: 'Von meinem Telefon gesendet',
    charsets: ['iso-8859-1', 'windows-1252', 'iso-8859-15'],
  },
  {
    language: 'French',
    own: 'Le compteur de notre nouvelle maison affiche un relevé erroné.\nMerci de corriger la dernière facture.',
    words: ['compteur', 'erroné', 'facture'],
    earlier: 'De quelle adresse s’agit-il ?',
    attributions: [
      'Le mar. 3 mars 2026 à 10:15, Fenmark Water <help@fenmarkwater.example> a écrit :',
      'Le 03/03/2026 à 10:15, Fenmark Water a écrit :',
    ],
    banners: [
      "-----Message d'origine-----",
      '---------- Message transféré ---------',
      'Début du message transféré :',
    ],
    printedHeader:
      'De : Fenmark Water\nEnvoyé : mardi 3 mars 2026 10:15\nÀ : Anna Berg\nObjet : Votre compteur',
    deviceLine: 'Envoyé de mon téléphone',
    charsets: ['windows-1252'],
  },
  {
    language: 'Spanish',
    own: 'El contador de la casa nueva muestra una lectura errónea.\nCorrijan por favor la última factura.',
    words: ['contador', 'errónea', 'última'],
    earlier: '¿De qué dirección se trata?',
    attributions: [
      'El mar, 3 mar 2026 a las 10:15, Fenmark Water (<help@fenmarkwater.example>) escribió:',
      'El 03/03/2026 a las 10:15, Fenmark Water escribió:',
    ],
    banners: [
      '-----Mensaje original-----',
      '---------- Mensaje reenviado ---------',
      'Inicio del mensaje reenviado:',
    ],
    printedHeader:
      'De: Fenmark Water\nEnviado el: martes, 3 de marzo de 2026 10:15\nPara: Anna Berg\nAsunto: Su contador',
    deviceLine: 'Enviado desde mi teléfono',
    charsets: ['iso-8859-1'],
  },
  {
    language: 'Polish',
    own: 'Wodomierz w nowym domu pokazuje błędny odczyt.\nProszę poprawić ostatnią fakturę.',
    words: ['Wodomierz', 'błędny', 'fakturę'],
    earlier: 'O który adres chodzi?',
    attributions: [
      'wt., 3 mar 2026 o 10:15 Fenmark Water <help@fenmarkwater.example> napisał(a):',
      'W dniu 3.03.2026 o 10:15, Fenmark Water pisze:',
      'Dnia 3 marca 2026 10:15 Fenmark Water <help@fenmarkwater.example> napisał(a):',
    ],
    banners: ['-----Wiadomość oryginalna-----', '---------- Wiadomość przekazana ----------'],
    printedHeader: 'Od: Fenmark Water\nWysłano: wtorek, 3 marca 2026 10:15\nDo: Anna Berg\nTemat: Wodomierz',
    deviceLine: 'Wysłane z telefonu',
    charsets: ['iso-8859-2', 'windows-1250'],
  },
  {
    language: 'Greek',
    own: 'Ο μετρητής στο νέο σπίτι δείχνει λάθος ένδειξη.\nΠαρακαλώ διορθώστε τον τελευταίο λογαριασμό.',
    words: ['μετρητής', 'ένδειξη', 'λογαριασμό'],
    earlier: 'Για ποια διεύθυνση πρόκειται;',
    attributions: [
      'Στις Τρί 3 Μαρ 2026 στις 10:15 π.μ., ο χρήστης Fenmark Water <help@fenmarkwater.example> έγραψε:',
      'Στις 3/3/2026 10:15, ο Fenmark Water έγραψε:',
    ],
    banners: ['-----Αρχικό μήνυμα-----', '---------- Προωθημένο μήνυμα ---------'],
    printedHeader:
      'Από: Fenmark Water\nΣτάλθηκε: Τρίτη, 3 Μαρτίου 2026 10:15\nΠρος: Anna Berg\nΘέμα: Ο μετρητής σας',
    deviceLine: 'Στάλθηκε από το κινητό μου',
    charsets: ['iso-8859-7', 'windows-1253'],
  },
  {
    language: 'Russian',
    own: 'Счётчик в новом доме показывает неверные данные.\nИсправьте, пожалуйста, последний счёт.',
    words: ['Счётчик', 'неверные', 'счёт'],
    earlier: 'О каком адресе идёт речь?',
    attributions: [
      'вт, 3 мар. 2026 г. в 10:15, Fenmark Water <help@fenmarkwater.example>:',
      '03.03.2026 10:15, Fenmark Water пишет:',
      '3 марта 2026 г., в 10:15, Fenmark Water <help@fenmarkwater.example> написал(а):',
    ],
    banners: ['-----Исходное сообщение-----', '-------- Пересылаемое сообщение --------'],
    printedHeader: 'От: Fenmark Water\nОтправлено: 3 марта 2026 г. 10:15\nКому: Anna Berg\nТема: Ваш счётчик',
    deviceLine: 'Отправлено с телефона',
    charsets: ['koi8-r', 'windows-1251', 'iso-8859-5'],
  },
  {
    language: 'Arabic',
    own: 'عداد المياه في بيتنا الجديد يعرض قراءة خاطئة.\nيرجى تصحيح الفاتورة الأخيرة.',
    words: ['عداد', 'قراءة', 'الفاتورة'],
    earlier: 'ما هو العنوان المقصود؟',
    attributions: [
      'في الثلاثاء، 3 مارس 2026 في 10:15 ص تمت كتابة ما يلي بواسطة Fenmark Water <help@fenmarkwater.example>:',
      'في 03/03/2026 10:15، كتب Fenmark Water:',
    ],
    banners: ['-----الرسالة الأصلية-----', '---------- رسالة معاد توجيهها ---------'],
    printedHeader: 'من: Fenmark Water\nتم الإرسال: 3 مارس 2026 10:15\nإلى: Anna Berg\nالموضوع: عداد المياه',
    deviceLine: 'تم الإرسال من هاتفي',
    charsets: ['windows-1256', 'iso-8859-6'],
  },
  {
    language: 'Hebrew',
    own: 'מד המים בבית החדש מציג קריאה שגויה.\nנא לתקן את החשבון האחרון.',
    words: ['המים', 'קריאה', 'החשבון'],
    earlier: 'באיזו כתובת מדובר?',
    attributions: [
      'בתאריך יום ג׳, 3 במרץ 2026 ב-10:15 מאת Fenmark Water <help@fenmarkwater.example>:',
      'ב-3.3.2026 10:15, Fenmark Water כתב:',
    ],
    banners: ['-----הודעה מקורית-----', '---------- הודעה שהועברה ---------'],
    printedHeader: 'מאת: Fenmark Water\nנשלח: יום שלישי 3 מרץ 2026 10:15\nאל: Anna Berg\nנושא: מד המים',
    deviceLine: 'נשלח מהטלפון שלי',
    charsets: ['windows-1255', 'iso-8859-8'],
  },
  {
    language: 'Hindi',
    own: 'हमारे नए घर का मीटर गलत रीडिंग दिखाता है।\nकृपया पिछला बिल ठीक करें।',
    words: ['मीटर', 'रीडिंग', 'बिल'],
    earlier: 'यह किस पते के बारे में है?',
    attributions: [
      'मंगल, 3 मार्च 2026 को 10:15 am बजे को Fenmark Water <help@fenmarkwater.example> ने लिखा:',
      '3/3/2026 10:15 को Fenmark Water ने लिखा:',
    ],
    banners: ['-----मूल संदेश-----', '---------- अग्रेषित संदेश ---------'],
    printedHeader: 'प्रेषक: Fenmark Water\nभेजा गया: 3 मार्च 2026 10:15\nप्रति: Anna Berg\nविषय: आपका मीटर',
    deviceLine: 'मेरे फ़ोन से भेजा गया',
    charsets: ['utf-16'],
  },
  {
    language: 'Japanese',
    own: '新しい家の水道メーターの検針値が間違っています。\n先月の請求書を訂正してください。',
    words: ['水道メーター', '検針値', '請求書'],
    earlier: 'どちらの住所でしょうか。',
    attributions: [
      '2026年3月3日(火) 10:15 Fenmark Water <help@fenmarkwater.example>:',
      '2026/03/03 10:15、Fenmark Waterのメール：',
      'On 2026/03/03 10:15, Fenmark Water wrote:',
    ],
    banners: ['-----元のメッセージ-----', '---------- 転送メッセージ ---------'],
    printedHeader: '差出人: Fenmark Water\n送信日時: 2026年3月3日 10:15\n宛先: Anna Berg\n件名: 水道メーター',
    deviceLine: '電話から送信',
    charsets: ['iso-2022-jp', 'shift_jis', 'euc-jp'],
  },
  {
    language: 'Chinese',
    own: '我们新家的水表读数不对。\n请更正上个月的账单。',
    words: ['水表', '读数', '账单'],
    earlier: '请问是哪个地址？',
    attributions: [
      'Fenmark Water <help@fenmarkwater.example> 于2026年3月3日周二 10:15写道：',
      '在 2026/3/3 10:15, Fenmark Water 写道:',
    ],
    banners: ['-----原始邮件-----', '---------- 转发的邮件 ---------'],
    printedHeader: '发件人: Fenmark Water\n发送时间: 2026年3月3日 10:15\n收件人: Anna Berg\n主题: 水表',
    deviceLine: '发自我的手机',
    charsets: ['gb2312', 'gb18030', 'gbk'],
  },
  {
    language: 'Thai',
    own: 'มิเตอร์น้ำที่บ้านใหม่แสดงค่าไม่ถูกต้อง\nกรุณาแก้ไขใบแจ้งหนี้ล่าสุด',
    words: ['มิเตอร์', 'ใบแจ้งหนี้'],
    earlier: 'ที่อยู่ใดคะ',
    attributions: [
      'ในวันที่ อ. 3 มี.ค. 2026 เวลา 10:15 Fenmark Water <help@fenmarkwater.example> เขียนว่า:',
      'เมื่อ 3/3/2026 10:15, Fenmark Water เขียนว่า:',
    ],
    banners: ['-----ข้อความต้นฉบับ-----', '---------- ข้อความที่ส่งต่อ ---------'],
    printedHeader: 'จาก: Fenmark Water\nส่ง: 3 มีนาคม 2026 10:15\nถึง: Anna Berg\nเรื่อง: มิเตอร์น้ำ',
    deviceLine: 'ส่งจากโทรศัพท์ของฉัน',
    charsets: ['tis-620', 'windows-874'],
  },
  {
    language: 'Korean',
    own: '새 집의 수도 계량기 검침 값이 틀립니다.\n지난달 청구서를 고쳐 주세요.',
    words: ['수도', '계량기', '청구서를'],
    earlier: '어느 주소인가요?',
    attributions: [
      '2026년 3월 3일 (화) 오전 10:15, Fenmark Water <help@fenmarkwater.example>님이 작성:',
      '2026-03-03 10:15에 Fenmark Water 님이 작성:',
    ],
    banners: ['-----원본 메시지-----', '---------- 전달된 메시지 ---------'],
    printedHeader:
      '보낸 사람: Fenmark Water\n보낸 날짜: 2026년 3월 3일 10:15\n받는 사람: Anna Berg\n제목: 수도 계량기',
    deviceLine: '나의 전화에서 보냄',
    charsets: ['euc-kr', 'ks_c_5601-1987'],
  },
];
