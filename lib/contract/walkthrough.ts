/**
 * The walk-through for device makers: what stands here is printed on the page and run by a test exactly so. It needs
 * bash, curl, openssl 3 and the standard tools. Later steps use what earlier ones set.
 */
export interface WalkStep {
  id: string;
  title: string;
  text: string;
  code: string;
  /** Only one of the steps of a kind is taken. */
  either?: 'key';
}

const TOOLS = String.raw`# As base64url without padding (RFC 7515, 2)
b64url() { openssl base64 -A | tr '+/' '-_' | tr -d '='; }

# One text member of a JSON answer
member() { sed -n "s/.*\"$1\":\"\([^\"]*\)\".*/\1/p"; echo; }

# Header and payload as a signed compact JWS
jws() {
  local input
  input="$(printf '%s' "$1" | b64url).$(printf '%s' "$2" | b64url)"
  printf '%s.%s' "$input" "$(printf '%s' "$input" | sign | b64url)"
}`;

const P256 = String.raw`openssl ecparam -name prime256v1 -genkey -noout -out device.pem
openssl ec -in device.pem -pubout -outform DER -out public.der 2> /dev/null
X=$(tail -c 64 public.der | head -c 32 | b64url)
Y=$(tail -c 32 public.der | b64url)
JWK="{\"kty\":\"EC\",\"crv\":\"P-256\",\"x\":\"$X\",\"y\":\"$Y\"}"
ALG=ES256

# openssl writes DER; JWS wants r and s, 32 bytes each (RFC 7518, 3.4)
der_to_raw() {
  printf '%b' "$(openssl asn1parse -inform DER | awk -F: '/INTEGER/ {
    n = $NF; while (length(n) < 64) n = "0" n; printf "%s", n }' | sed 's/../\\x&/g')"
}
sign() { openssl dgst -sha256 -sign device.pem | der_to_raw; }`;

const ED25519 = String.raw`openssl genpkey -algorithm ed25519 -out device.pem
X=$(openssl pkey -in device.pem -pubout -outform DER | tail -c 32 | b64url)
JWK="{\"kty\":\"OKP\",\"crv\":\"Ed25519\",\"x\":\"$X\"}"
ALG=EdDSA
sign() { cat > input.bin; openssl pkeyutl -sign -inkey device.pem -rawin -in input.bin; }`;

const ENROL = String.raw`PROOF=$(jws "{\"alg\":\"$ALG\",\"typ\":\"enrolment-proof+jwt\"}" \
  "{\"aud\":\"$ORIGIN\",\"sub\":\"$SERIAL\",\"code\":\"$CODE\"}")
curl -sS --fail-with-body -D fields.txt "$ORIGIN/api/device/v1/enrol" \
  -H 'content-type: application/json' \
  -d "{\"code\":\"$CODE\",\"serialNumber\":\"$SERIAL\",\"publicKey\":$JWK,\"proof\":\"$PROOF\"}" \
  > credential.json
TOKEN=$(member token < credential.json)
member assetTag < credential.json`;

const CALL = String.raw`nonce() { tr -d '\r' < fields.txt | awk 'tolower($1) == "dpop-nonce:" { print $2 }' | tail -n 1; }
call() {
  local url="$ORIGIN$1" ath proof
  ath=$(printf '%s' "$TOKEN" | openssl dgst -sha256 -binary | b64url)
  proof=$(jws "{\"typ\":\"dpop+jwt\",\"alg\":\"$ALG\",\"jwk\":$JWK}" \
    "{\"jti\":\"$(openssl rand -hex 16)\",\"htm\":\"POST\",\"htu\":\"$url\",\"iat\":$(date +%s),\"ath\":\"$ath\",\"nonce\":\"$(nonce)\"}")
  curl -sS --fail-with-body -w '\n' -D fields.txt "$url" \
    -H "authorization: DPoP $TOKEN" -H "dpop: $proof" \
    -H 'content-type: application/json' -d "$2"
}`;

const HEARTBEAT = String.raw`call /api/device/v1/heartbeat "{\"deviceTime\":$(date +%s)000,\"batteryPercent\":81}"`;

const SLOT = String.raw`# Twelve seconds of noise at 4000 Hz, where you have no recording at hand
[ -f clip.wav ] || {
  printf 'RIFF\x24\x77\x01\x00WAVEfmt \x10\x00\x00\x00\x01\x00\x01\x00\xa0\x0f\x00\x00\x40\x1f\x00\x00\x02\x00\x10\x00data\x00\x77\x01\x00'
  openssl rand 96000
} > clip.wav
SHA256=$(openssl dgst -sha256 -r clip.wav | cut -c 1-64)
BYTES=$(wc -c < clip.wav | tr -d ' ')
NOW=$(date +%s)000
call /api/device/v1/recordings "{\"recordingNumber\":\"walk-$NOW\",\"sha256\":\"$SHA256\",\"bytes\":$BYTES,\"mediaType\":\"audio/wav\",\"recordedAt\":$NOW,\"deviceTime\":$NOW}" > slot.json
member recording < slot.json`;

const PUT = String.raw`# The fields that the slot asks for, as a curl configuration
sed -n 's/.*"headers":{\([^}]*\)}.*/\1/p' slot.json | sed 's/","/"\n"/g' \
  | sed 's/^"\([^"]*\)":"\(.*\)"$/header = "\1: \2"/' > put.conf
curl -sS --fail-with-body -X PUT -K put.conf --data-binary @clip.wav "$(member url < slot.json)"`;

const COMPLETE = `call "/api/device/v1/recordings/$(member recording < slot.json)/complete" '{}' > verdict.json
member verdict < verdict.json`;

const RENEW = String.raw`call /api/device/v1/token '{}' > credential.json
TOKEN=$(member token < credential.json)
call /api/device/v1/heartbeat "{\"deviceTime\":$(date +%s)000}"`;

/** @param origin address of this service, printed as the one to call */
export const walkthrough = (origin: string): WalkStep[] => [
  {
    id: 'sheet',
    title: 'What the enrolment sheet says',
    text: 'Put your own serial number and one-time code in, or export them before.',
    code: `set -eu\nORIGIN=\${ORIGIN:-${origin}}\nSERIAL=\${SERIAL:-SN-0001}\nCODE=\${CODE:-7K3F92QX4M}`,
  },
  {
    id: 'tools',
    title: 'Three small tools',
    text: 'Base64url, one member out of an answer, and a signed JWS. A device has these in a library.',
    code: TOOLS,
  },
  {
    id: 'p-256',
    title: 'A key pair: P-256',
    text: 'The private half stays in device.pem. ES256 signatures are r and s side by side, so openssl’s DER is unpacked.',
    code: P256,
    either: 'key',
  },
  {
    id: 'ed25519',
    title: 'Or a key pair: Ed25519',
    text: 'Take this one instead of P-256 where the device can.',
    code: ED25519,
    either: 'key',
  },
  {
    id: 'enrol',
    title: 'Enrol',
    text: 'The proof shows that the device holds the private half. Repeat the call if no answer came.',
    code: ENROL,
  },
  {
    id: 'call',
    title: 'How every call is made',
    text: 'Each one carries the token and a fresh proof for this method and address, with the nonce of the answer before. An answer use-dpop-nonce means: once more, with the nonce it brings.',
    code: CALL,
  },
  {
    id: 'heartbeat',
    title: 'Say how the device is',
    text: 'About once a minute.',
    code: HEARTBEAT,
  },
  {
    id: 'slot',
    title: 'Ask for an upload slot',
    text: 'Length and SHA-256 are announced before the bytes are sent.',
    code: SLOT,
  },
  {
    id: 'put',
    title: 'Put the bytes',
    text: 'Straight to storage, with the header fields of the slot exactly as they stand there.',
    code: PUT,
  },
  {
    id: 'complete',
    title: 'Complete, and hear the verdict',
    text: 'Noise is not a chest: expect “care” or “repeat”. Show the reasons to the person at the bedside.',
    code: COMPLETE,
  },
  {
    id: 'renew',
    title: 'Renew the credential',
    text: 'When renewAfter is over or an answer says renew. The first call with the new token retires the old one.',
    code: RENEW,
  },
];
