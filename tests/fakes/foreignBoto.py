"""What a client written with boto3 does with the store; ends with an assertion where something is not as it should be."""

import io
import os
import urllib.request

import boto3
from boto3.s3.transfer import TransferConfig
from botocore.config import Config
from botocore.exceptions import ClientError

BUCKET = os.environ["STORE_BUCKET"]
PREFIX = "boto3/"


def connect(signature):
    config = Config(signature_version=signature, retries={"max_attempts": 0})
    return boto3.client("s3", endpoint_url=os.environ["STORE_URL"], config=config)


def code_of(call, **arguments):
    try:
        call(**arguments)
    except ClientError as error:
        return error.response["Error"]["Code"]
    return None


def fetch(url, **arguments):
    return urllib.request.urlopen(urllib.request.Request(url, **arguments))


# None: the version that boto3 takes by itself, which for presigned addresses in us-east-1 is the second.
for signature in (None, "s3v4"):
    s3 = connect(signature)
    key = PREFIX + "with space/ünïcode ☃ +&=.wav"
    body = os.urandom(5000)
    s3.put_object(Bucket=BUCKET, Key=key, Body=body, ContentType="audio/wav", Metadata={"note": "n"})
    head = s3.head_object(Bucket=BUCKET, Key=key)
    assert (head["ContentLength"], head["ContentType"], head["Metadata"]) == (5000, "audio/wav", {"note": "n"})
    assert s3.get_object(Bucket=BUCKET, Key=key)["Body"].read() == body
    assert s3.get_object(Bucket=BUCKET, Key=key, Range="bytes=10-19")["Body"].read() == body[10:20]
    assert code_of(s3.head_object, Bucket=BUCKET, Key="nowhere") == "404"
    assert code_of(s3.get_object, Bucket=BUCKET, Key="nowhere") == "NoSuchKey"

    large = os.urandom(21 * 1024 * 1024)
    s3.upload_fileobj(io.BytesIO(large), BUCKET, PREFIX + "large", Config=TransferConfig(multipart_chunksize=6 * 1024 * 1024))
    assert s3.head_object(Bucket=BUCKET, Key=PREFIX + "large")["ETag"].endswith('-4"')
    back = io.BytesIO()
    s3.download_fileobj(BUCKET, PREFIX + "large", back)
    assert back.getvalue() == large
    s3.copy({"Bucket": BUCKET, "Key": PREFIX + "large"}, BUCKET, PREFIX + "copy")
    assert s3.head_object(Bucket=BUCKET, Key=PREFIX + "copy")["ContentLength"] == len(large)

    get = s3.generate_presigned_url("get_object", Params={"Bucket": BUCKET, "Key": key}, ExpiresIn=60)
    assert fetch(get).read() == body
    put = s3.generate_presigned_url("put_object", Params={"Bucket": BUCKET, "Key": PREFIX + "presigned"}, ExpiresIn=60)
    assert fetch(put, data=b"by address", method="PUT", headers={"Content-Type": ""}).status == 200
    assert s3.get_object(Bucket=BUCKET, Key=PREFIX + "presigned")["Body"].read() == b"by address"

    for number in range(23):
        s3.put_object(Bucket=BUCKET, Key="%snumbered/%03d" % (PREFIX, number), Body=b"x")
    for operation in ("list_objects_v2", "list_objects"):
        pages = s3.get_paginator(operation).paginate(Bucket=BUCKET, Prefix=PREFIX, PaginationConfig={"PageSize": 5})
        keys = [entry["Key"] for page in pages for entry in page["Contents"]]
        assert len(keys) == 27 and keys == sorted(keys) and key in keys, keys
    shallow = s3.list_objects_v2(Bucket=BUCKET, Prefix=PREFIX, Delimiter="/")
    assert [one["Prefix"] for one in shallow["CommonPrefixes"]] == [PREFIX + "numbered/", PREFIX + "with space/"]

    gone = s3.delete_objects(Bucket=BUCKET, Delete={"Objects": [{"Key": one} for one in keys]})
    assert len(gone["Deleted"]) == 27 and "Errors" not in gone
    assert s3.list_objects_v2(Bucket=BUCKET, Prefix=PREFIX)["KeyCount"] == 0

stranger = boto3.client("s3", endpoint_url=os.environ["STORE_URL"], aws_secret_access_key="wrong", aws_access_key_id=os.environ["AWS_ACCESS_KEY_ID"])
assert code_of(stranger.list_objects_v2, Bucket=BUCKET) == "SignatureDoesNotMatch"
print("all as it should be")
