"""What makes two systems, or two answers, the same: digests of their canonical content."""

from hashlib import blake2b

from pydantic import BaseModel


def canonical(model: BaseModel) -> bytes:
    """`model` as JSON in one fixed form: SI, defaults filled, fields in the contract's order."""
    return model.__pydantic_serializer__.to_json(model, exclude_none=True)


def digest(*parts: bytes) -> str:
    """40 hexadecimal digits of BLAKE2b (RFC 7693) over the parts, each with its length."""
    whole = blake2b(digest_size=20)
    for part in parts:
        whole.update(b"%d:" % len(part))
        whole.update(part)
    return whole.hexdigest()


def system_id(content: bytes) -> str:
    """The id of a system whose canonical form is `content`."""
    return "s" + digest(b"system", content)


def answer_id(task: str, system: str, options: bytes, computation: str) -> str:
    """The id of the answer of `task` on `system` with canonical `options`."""
    return "a" + digest(computation.encode(), task.encode(), system.encode(), options)


def options(question: BaseModel) -> bytes:
    """The canonical form of what a question asks, apart from the system it asks it of."""
    return question.__pydantic_serializer__.to_json(
        question, exclude={"system", "system_id"}, exclude_none=True
    )
